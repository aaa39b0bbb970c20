"""A piece of YAML text that knows its place, and what a reader may ask of it.

A `Node` is asked for what the reader expects, e.g. `node.number(faults, low=0)`: the
value comes back, or `None` after a fault was added to the list.  Keys are strict and
types are never guessed.  How nodes come from a text is in `placer.yamltext`.
"""

from __future__ import annotations

import math
import re
from collections.abc import Collection, Sequence
from dataclasses import dataclass
from typing import Literal

from placer.errors import Fault, InputError, Place, did_you_mean

Faults = list[Fault]
"""Where readers collect faults, so that one pass reports them all."""

_MOST_DIGITS = 400  # of a whole number; a 1024-bit constant has 309
_SHOWN = 60  # characters of an offending value that a message repeats

_DIGITS = re.compile(r"[+-]?(0|[1-9][0-9]*)")
_ROUND_POWER = re.compile(r"[+-]?[1-9][0-9]*[eE]\+?[0-9]{1,2}")
_NUMBER = re.compile(r"[+-]?(0|[1-9][0-9]*)?(\.[0-9]*)?([eE][+-]?[0-9]{1,4})?")
_NULL_WORDS = ("", "~", "null", "Null", "NULL")

Kind = Literal["mapping", "sequence", "scalar"]


@dataclass(frozen=True, slots=True)
class Node:
    """One piece of a YAML text.

    `label` is how messages name it: its key, or `key[position]` in a sequence.  A
    scalar has its `value` and says whether it was `quoted`; a sequence has `items`; a
    mapping has `entries`, keys and values in the order of the file.
    """

    kind: Kind
    place: Place
    label: str
    value: str = ""
    quoted: bool = False
    items: tuple[Node, ...] = ()
    entries: tuple[tuple[Node, Node], ...] = ()

    @property
    def is_mapping(self) -> bool:
        """Whether this is a mapping."""
        return self.kind == "mapping"

    @property
    def is_sequence(self) -> bool:
        """Whether this is a sequence."""
        return self.kind == "sequence"

    @property
    def is_null(self) -> bool:
        """Whether this is an empty value, `~` or `null`."""
        return self.kind == "scalar" and not self.quoted and self.value in _NULL_WORDS

    @property
    def is_scalar(self) -> bool:
        """Whether this is a single value that is not null."""
        return self.kind == "scalar" and not self.is_null

    @property
    def shown(self) -> str:
        """The node as a message repeats it: short, on one line."""
        if self.is_null:
            return "empty"
        if self.kind != "scalar":
            return "a mapping" if self.is_mapping else "a list"
        text = repr(self.value)
        return text if len(text) <= _SHOWN else text[: _SHOWN - 4] + "...'"

    def fault(self, faults: Faults, code: str, what: str, help: str = "") -> None:
        """Add a fault at the place of this node."""
        faults.append(Fault(self.place, code, what, help))

    def mapping(
        self,
        faults: Faults,
        *,
        keys: Sequence[str] | None = None,
        required: Collection[str] = (),
    ) -> dict[str, Node] | None:
        """Return the values by key; `keys` are the ones allowed (`None`: any).

        Unknown, repeated and missing keys are faults; the other entries still come
        back, so that their own faults are found in the same pass.  `None` means that
        the node is no mapping.
        """
        if not self.is_mapping:
            known = f"with the keys {', '.join(keys)}" if keys else "of keys to values"
            self._is_not(faults, "a mapping", f"write a mapping {known}")
            return None
        found: dict[str, Node] = {}
        for key, value in self.entries:
            if key.kind != "scalar":
                key.fault(faults, "bad-key", f"a key must be a word, not {key.shown}")
            elif keys is not None and key.value not in keys:
                key.fault(
                    faults,
                    "unknown-key",
                    f"unknown key {key.shown} in {self.label}",
                    did_you_mean(key.value, keys) or f"known keys: {', '.join(keys)}",
                )
            elif key.value in found:
                first = self.key_place(key.value).line
                key.fault(
                    faults,
                    "repeated-key",
                    f"{key.shown} stands twice in {self.label}, first in line {first}",
                    "keep one of them",
                )
            else:
                found[key.value] = value
        for name in required:
            if name not in found:
                self.fault(
                    faults, "missing-key", f"{self.label} needs the key '{name}'"
                )
        return found

    def key_place(self, key: str) -> Place:
        """Return where a key of this mapping stands, or the place of the mapping."""
        for name, _ in self.entries:
            if name.value == key:
                return name.place
        return self.place

    def sequence(
        self, faults: Faults, *, least: int = 0, most: int | None = None
    ) -> tuple[Node, ...] | None:
        """Return the items of a sequence of `least` to `most` items."""
        if not self.is_sequence:
            self._is_not(faults, "a list", "write a list, such as [0, 1]")
            return None
        count = len(self.items)
        if count < least or (most is not None and count > most):
            size = _range_words(least, most)
            self.fault(
                faults,
                "bad-length",
                f"{self.label} has {count} items, expected {size}",
            )
            return None
        return self.items

    def text(self, faults: Faults) -> str | None:
        """Return a scalar exactly as written, quoted or not."""
        if not self.is_scalar:
            self._is_not(faults, "a text", "write a word or a quoted text")
            return None
        return self.value

    def choice(self, faults: Faults, words: Sequence[str]) -> str | None:
        """Return a scalar that is one of some words."""
        if not self.is_scalar:
            self._is_not(faults, f"one of {', '.join(words)}")
            return None
        if self.value not in words:
            self.fault(
                faults,
                "unknown-word",
                f"{self.label} is {self.shown}, not one of {', '.join(words)}",
                did_you_mean(self.value, words),
            )
            return None
        return self.value

    def flag(self, faults: Faults) -> bool | None:
        """Return `true` or `false`, and nothing that only looks like it."""
        if self.kind == "scalar" and not self.quoted:
            if self.value == "true":
                return True
            if self.value == "false":
                return False
        self._is_not(faults, "true or false", "write true or false, without quotes")
        return None

    def number(
        self,
        faults: Faults,
        *,
        low: float | None = None,
        high: float | None = None,
        above: float | None = None,
        below: float | None = None,
    ) -> float | None:
        """Return a number in plain or scientific notation.

        `low` and `high` belong to the range, `above` and `below` do not.
        """
        if not self._is_plain_number(faults):
            return None
        number = float(self.value)
        if math.isinf(number):
            self.fault(
                faults, "out-of-range", f"{self.label} {self.value} is too large"
            )
            return None
        limits = (
            ("at least", low, number.__lt__),
            ("above", above, number.__le__),
            ("at most", high, number.__gt__),
            ("below", below, number.__ge__),
        )
        for words, limit, is_beyond in limits:
            if limit is not None and is_beyond(float(limit)):
                self.fault(
                    faults,
                    "out-of-range",
                    f"{self.label} is {self.value}, must be {words} {limit:g}",
                )
                return None
        return number

    def whole(
        self, faults: Faults, *, low: int | None = None, high: int | None = None
    ) -> int | None:
        """Return a whole number from `low` to `high`, both included."""
        if not self._is_plain_number(faults):
            return None
        if len(self.value) > _MOST_DIGITS:
            self.fault(faults, "out-of-range", f"{self.label} has too many digits")
            return None
        if _DIGITS.fullmatch(self.value):
            number = int(self.value)
        elif _ROUND_POWER.fullmatch(self.value):
            digits, power = re.split("[eE]", self.value)
            number = int(digits) * 10 ** int(power)
        else:
            self._is_not(faults, "a whole number", "write a number without a fraction")
            return None
        if (low is not None and number < low) or (high is not None and number > high):
            self.fault(
                faults,
                "out-of-range",
                f"{self.label} is {self.value}, must be {_range_words(low, high)}",
            )
            return None
        return number

    def _is_plain_number(self, faults: Faults) -> bool:
        if self.kind == "scalar" and _is_number(self.value):
            if not self.quoted:
                return True
            help = f"write {self.value} without quotes"
        elif self.kind == "scalar" and _is_number(self.value.replace("_", "")):
            help = f"write {self.value.replace('_', '')}"
        elif self.kind == "scalar" and _is_number(self.value.lstrip("0")):
            help = "write the number without leading zeros"
        else:
            help = "write a number such as 50, 0.01 or 1e-3"
        self._is_not(faults, "a number", help)
        return False

    def _is_not(self, faults: Faults, what: str, help: str = "") -> None:
        text = "is empty, not" if self.is_null else f"is {self.shown}, not"
        self.fault(faults, "wrong-type", f"{self.label} {text} {what}", help)


def raise_if_any(faults: Faults) -> None:
    """Raise one `InputError` with all faults, if there are any."""
    if faults:
        raise InputError(faults)


def _is_number(text: str) -> bool:
    match = _NUMBER.fullmatch(text)
    return match is not None and any(
        sign.isdigit() for sign in (match[1] or "") + (match[2] or "")
    )


def _range_words(low: int | None, high: int | None) -> str:
    if low is not None and low == high:
        return f"{low}"
    if low is not None and high is not None:
        return f"{low} to {high}"
    return f"at least {low}" if low is not None else f"at most {high}"
