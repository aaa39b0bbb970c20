"""YAML text to nodes that know their place; strict keys, no guessed types.

`parse` reads one document and refuses what makes a text ambiguous (anchors, aliases,
tags, several documents).  What a reader may ask of a node is in `placer.yamlnode`.
Nothing here knows a device or a program.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol

import yaml

from placer.errors import Fault, InputError, Place
from placer.yamlnode import Faults, Kind, Node, raise_if_any

__all__ = ["DEEPEST", "LARGEST_TEXT", "Faults", "Node", "parse", "raise_if_any"]

LARGEST_TEXT = 2_000_000  # characters; a device of 5000 sites spelled out has half
DEEPEST = 40  # nested collections; a program needs about ten
_SURROGATE = re.compile("[\ud800-\udfff]")
_SHOWN = 60  # characters of a key that a message repeats


def parse(text: str, file: str) -> Node:
    r"""Return the root node of a text that holds exactly one YAML document.

    Raises
    ------
    InputError
        If the text is no YAML, is empty, holds several documents, or uses anchors,
        aliases or tags; nothing else, whatever the text.

    Examples
    --------
    >>> faults = []
    >>> root = parse("name: toy\nsite: 4", "toy.yaml")
    >>> root.mapping(faults, keys=("name", "sites"), required=("name",)).keys()
    dict_keys(['name'])
    >>> print(faults[0])
    toy.yaml:2:1: error[unknown-key]: unknown key 'site' in the file
      help: did you mean 'sites'?
    """
    start = Place(file, 1, 1)
    if len(text) > LARGEST_TEXT:
        raise InputError.at(
            Place(file),
            "too-large",
            f"the text has {len(text)} characters, more than {LARGEST_TEXT}",
        )
    faults: Faults = []
    builder = _Builder(file, faults, [], [], [])
    for event in _events(text, file):
        builder.take(event)
    if not builder.roots:
        raise InputError.at(start, "empty-file", "the file is empty")
    if faults:
        raise InputError(faults)
    return builder.roots[0]


class _Mark(Protocol):
    """A position that the parser reports, counted from 0."""

    line: int
    column: int


@dataclass(slots=True)
class _Open:
    """A collection whose end has not come yet."""

    kind: Kind
    place: Place
    label: str
    children: list[Node]


@dataclass(slots=True)
class _Builder:
    """Turns parser events into nodes without recursion, so depth cannot hurt."""

    file: str
    faults: Faults
    stack: list[_Open]
    roots: list[Node]
    documents: list[Place]

    def take(self, event: yaml.Event) -> None:
        place = _place_of(self.file, event.start_mark)
        if isinstance(event, yaml.DocumentStartEvent):
            self.documents.append(place)
            if len(self.documents) == 2:
                self._refuse(place, "several-documents", "a second document starts")
        elif isinstance(event, yaml.AliasEvent):
            self._refuse(place, "alias", f"the alias '*{event.anchor}' is not allowed")
            self._add(Node("scalar", place, self._label()))
        elif isinstance(event, yaml.CollectionEndEvent):
            self._close()
        elif isinstance(event, yaml.NodeEvent):
            self._start(event, place)

    def _start(self, event: yaml.NodeEvent, place: Place) -> None:
        if event.anchor is not None:
            self._refuse(
                place, "anchor", f"the anchor '&{event.anchor}' is not allowed"
            )
        tag = getattr(event, "tag", None)
        if tag is not None:
            self._refuse(place, "tag", f"the tag {tag!r} is not allowed")
        if isinstance(event, yaml.ScalarEvent):
            value = event.value
            if _SURROGATE.search(value):
                self._refuse(place, "bad-text", "half of a surrogate pair")
            node = Node("scalar", place, self._label(), value, bool(event.style))
            self._add(node)
            return
        if len(self.stack) >= DEEPEST:
            raise InputError.at(
                place, "too-deep", f"collections are nested more than {DEEPEST} deep"
            )
        kind: Kind = (
            "mapping" if isinstance(event, yaml.MappingStartEvent) else "sequence"
        )
        self.stack.append(_Open(kind, place, self._label(), []))

    def _close(self) -> None:
        done = self.stack.pop()
        children = tuple(done.children)
        if done.kind == "mapping":
            pairs = tuple(zip(children[::2], children[1::2], strict=True))
            self._add(Node("mapping", done.place, done.label, entries=pairs))
        else:
            self._add(Node("sequence", done.place, done.label, items=children))

    def _add(self, node: Node) -> None:
        (self.stack[-1].children if self.stack else self.roots).append(node)

    def _label(self) -> str:
        """Name the node that comes next."""
        if not self.stack:
            return "the file"
        parent = self.stack[-1]
        if parent.kind == "sequence":
            name = parent.label if len(self.stack) > 1 else "item"
            return f"{name}[{len(parent.children)}]"
        if len(parent.children) % 2 == 0:
            return "a key"
        key = parent.children[-1]
        return key.value[:_SHOWN] if key.kind == "scalar" else "a value"

    def _refuse(self, place: Place, code: str, what: str) -> None:
        help = {
            "several-documents": "keep one document in a file",
            "tag": "leave the tag out; types follow from the keys",
            "alias": "write the value out where it is needed",
            "anchor": "write the value out where it is needed",
        }.get(code, "")
        self.faults.append(Fault(place, code, what, help))


def _events(text: str, file: str) -> Iterator[yaml.Event]:
    """Yield the parser's events; its errors become an `InputError`."""
    try:
        yield from yaml.parse(text, Loader=yaml.SafeLoader)
    except yaml.MarkedYAMLError as error:
        place = _place_of(file, error.problem_mark or error.context_mark)
        parts = [part for part in (error.context, error.problem) if part]
        raise InputError.at(
            place, "bad-yaml", _one_line(", ".join(parts)), _syntax_help(parts)
        ) from error
    except yaml.reader.ReaderError as error:
        before = text[: error.position]
        place = Place(file, before.count("\n") + 1, len(before) - before.rfind("\n"))
        what = f"the character {chr(error.character)!r} is not allowed in a text file"
        raise InputError.at(place, "bad-text", what) from error
    except (ValueError, OverflowError) as error:
        # The scanner lets two odd cases through: an escape beyond Unicode, such as
        # "\UFFFFFFFF", and a directive with thousands of digits.
        raise InputError.at(
            Place(file, 1, 1),
            "bad-yaml",
            "an escape or a directive holds an impossible number",
        ) from error


def _place_of(file: str, mark: _Mark | None) -> Place:
    return Place(file, mark.line + 1, mark.column + 1) if mark else Place(file)


def _one_line(text: str) -> str:
    words = " ".join(text.split())
    return words[:300]


def _syntax_help(parts: Sequence[str]) -> str:
    text = " ".join(parts)
    if "\\t" in text:
        return "indent with spaces, not with tabs"
    if "mapping values are not allowed" in text:
        return "look for a missing space, indentation or quotes around a ':'"
    return ""
