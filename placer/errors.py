"""What can go wrong, said for people, with a place in the file and an exit status.

Every fault of an input is a `Fault`; one `InputError` carries all faults found in one
pass.  Nothing here reads files or prints.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True, order=True)
class Place:
    """A spot in a source text; line and column count from 1, 0 means unknown."""

    file: str
    line: int = 0
    column: int = 0

    def __str__(self) -> str:
        """Return `file:line:column`, without the parts that are unknown."""
        text = self.file
        if self.line:
            text += f":{self.line}"
            if self.column:
                text += f":{self.column}"
        return text


@dataclass(frozen=True, slots=True, order=True)
class Fault:
    """One fault of one input.

    `code` is a short kebab-case name, `what` says what is wrong with the offending
    value, `help` says what to do about it.
    """

    place: Place
    code: str
    what: str
    help: str = ""

    def __str__(self) -> str:
        """Return the text a person reads: place, code, what, and a help line."""
        text = f"{self.place}: error[{self.code}]: {self.what}"
        if self.help:
            text += f"\n  help: {self.help}"
        return text


class PlacerError(Exception):
    """Base of every error that this package raises on purpose."""

    exit_code = 70


class InputError(PlacerError):
    """A file or an option is wrong; carries every fault, sorted by place."""

    exit_code = 2

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults: tuple[Fault, ...] = tuple(sorted(set(faults)))
        super().__init__("\n".join(str(fault) for fault in self.faults))

    @classmethod
    def at(cls, place: Place, code: str, what: str, help: str = "") -> InputError:
        """Return an error with one fault."""
        return cls([Fault(place, code, what, help)])


class NoPlan(PlacerError):  # noqa: N818 - an outcome that exits 1, not a mistake
    """The limits leave no plan; the message names the limits in conflict."""

    exit_code = 1


class CheckFailed(PlacerError):  # noqa: N818
    """A plan broke a rule of the check."""

    exit_code = 1


class OutOfTime(PlacerError):  # noqa: N818
    """No plan was found in the work allowed."""

    exit_code = 3


class InternalError(PlacerError):
    """A bug of this package, with what a report needs."""

    exit_code = 70


def did_you_mean(word: str, known: Sequence[str]) -> str:
    """Return `did you mean 'x'?` for the nearest known word, or an empty string."""
    near = difflib.get_close_matches(word, list(known), n=1, cutoff=0.6)
    return f"did you mean '{near[0]}'?" if near else ""
