"""Annotations in the namespace `placer`: what they may say, checked strictly.

Annotations of other namespaces are handed on unchanged.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from placer.errors import Fault, InputError, did_you_mean
from placer.program.syntax import Annotation

PAIRED = ("compute", "uncompute")
_KNOWN = ("workspace", "lendable", "keep", *PAIRED)
_WORKSPACE = {"init": "zero", "ends": "zero"}


@dataclass(frozen=True, slots=True)
class WireNotes:
    """What annotations say about a register."""

    is_workspace: bool = False
    is_lendable: bool = True


def is_own(note: Annotation) -> bool:
    """Whether an annotation is in our namespace."""
    return note.name == "placer" or note.name.startswith("placer.")


def foreign(notes: Iterable[Annotation]) -> tuple[str, ...]:
    """Return the annotations of other namespaces as they are written."""
    return tuple(
        f"@{note.name} {note.rest}".strip() for note in notes if not is_own(note)
    )


def refuse_own(notes: Iterable[Annotation]) -> None:
    """Refuse annotations of ours on a statement that is no qubit declaration."""
    faults = []
    for note in notes:
        if is_own(note):
            is_pair = word_of(note) in PAIRED
            where = "a gate call or a loop" if is_pair else "a declaration of qubits"
            faults.append(
                Fault(
                    note.place,
                    "annotation-place",
                    f"'@{note.name}' belongs on {where}",
                )
            )
    if faults:
        raise InputError(faults)


def wire_notes(notes: Iterable[Annotation]) -> WireNotes:
    """Return what the annotations of a qubit declaration say."""
    words: dict[str, Annotation] = {}
    for note in notes:
        if not is_own(note):
            continue
        word = word_of(note)
        if word in PAIRED:
            refuse_own([note])
        if word in words:
            raise InputError.at(
                note.place, "annotation-twice", f"'@placer.{word}' stands twice"
            )
        words[word] = note
        _check_arguments(word, note)
    if "keep" in words and "lendable" in words:
        raise InputError.at(
            words["keep"].place,
            "annotation-conflict",
            "'@placer.keep' and '@placer.lendable' contradict each other",
            "keep one of them",
        )
    return WireNotes("workspace" in words, "keep" not in words)


def word_of(note: Annotation) -> str:
    """Return the word after the namespace, which must be known."""
    word = note.name.removeprefix("placer").removeprefix(".")
    if word not in _KNOWN:
        raise InputError.at(
            note.place,
            "unknown-annotation",
            f"unknown annotation '@{note.name}'",
            did_you_mean(word, _KNOWN)
            or f"known: {', '.join('@placer.' + known for known in _KNOWN)}",
        )
    return word


def _check_arguments(word: str, note: Annotation) -> None:
    wanted = _WORKSPACE if word == "workspace" else {}
    help = f"write '@placer.{word} init=zero ends=zero'" if wanted else ""
    found: dict[str, str] = {}
    for part in note.rest.split():
        key, _, value = part.partition("=")
        if key not in wanted or key in found or value != wanted[key]:
            raise InputError.at(
                note.place,
                "annotation-argument",
                f"'@placer.{word}' does not take {part!r}",
                help or "nothing may follow it on its line, not even a comment",
            )
        found[key] = value
    missing = [f"{key}={wanted[key]}" for key in wanted if key not in found]
    if missing:
        raise InputError.at(
            note.place,
            "annotation-argument",
            f"'@placer.{word}' lacks {' and '.join(missing)}",
            help,
        )


def arguments_of(
    note: Annotation, *, required: tuple[str, ...], optional: tuple[str, ...]
) -> dict[str, str]:
    """Return the `key=value` arguments of an annotation of ours.

    Raises
    ------
    InputError
        If one is missing, unknown, empty or there twice.
    """
    found: dict[str, str] = {}
    for part in note.rest.split():
        key, _, value = part.partition("=")
        if key not in (*required, *optional) or key in found or not value:
            raise InputError.at(
                note.place,
                "annotation-argument",
                f"'@{note.name}' does not take {part!r}",
                "it takes " + ", ".join(f"{k}=..." for k in (*required, *optional)),
            )
        found[key] = value
    missing = [key for key in required if key not in found]
    if missing:
        raise InputError.at(
            note.place,
            "annotation-argument",
            f"'@{note.name}' lacks {' and '.join(f'{key}=...' for key in missing)}",
        )
    return found
