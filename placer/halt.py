"""Stop early: a limit of wall-clock time, or an interruption by the user.

Work is counted, not timed; this is the safety net beneath.  Nothing here changes a
result unless it is due.
"""

from __future__ import annotations

import threading
import time
from typing import TYPE_CHECKING

from placer.errors import OutOfTime

if TYPE_CHECKING:
    from collections.abc import Callable

WATCH_SECONDS = 0.05


class Interrupted(OutOfTime):
    """The user ended the work before there was any plan."""


class Halt:
    """Says when the work must end, and remembers why and at which stage it did.

    `seconds` counts from the making of this object; a part of it is kept for what
    comes after the search (bounds, the writing, the check).
    """

    def __init__(self, seconds: float | None = None) -> None:
        self.seconds = seconds
        self.begun = time.monotonic()
        self.reserve = 0.2 * (seconds or 0.0)
        self.stage = "start"
        self.why = ""
        self.ended_at = ""

    def interrupt(self) -> None:
        """End the work at the next chance; safe to call from a signal handler."""
        self.why = self.why or "interrupted"

    def keep(self, seconds: float) -> None:
        """Keep so many seconds for what comes after the search, if that is more."""
        self.reserve = max(self.reserve, seconds)

    def left(self) -> float:
        """Return the seconds that are left for the search; infinite without a limit."""
        if self.seconds is None:
            return float("inf")
        return self.seconds - self.reserve - (time.monotonic() - self.begun)

    def is_due(self) -> bool:
        """Whether the work must end now."""
        if not self.why and self.left() <= 0:
            self.why = f"the wall-clock limit of {self.seconds:g} s was hit"
        if self.why and not self.ended_at:
            self.ended_at = self.stage
        return bool(self.why)

    @property
    def note(self) -> str:
        """What a plan says about an early end; empty if there was none."""
        if not self.ended_at:
            return ""
        text = f"{self.why} at stage '{self.ended_at}': the best found so far is shown"
        return f"{text}; a further run may find better"


NEVER = Halt()
"""The halt of work that nothing stops."""


def watched(halt: Halt, work: Callable[[], object], stop: Callable[[], object]) -> None:
    """Run work that knows no halt of its own; call `stop` when the halt is due.

    The work runs in a thread, so that the interpreter can take a signal meanwhile.

    Raises
    ------
    BaseException
        Whatever the work raises.
    """
    faults: list[BaseException] = []

    def run() -> None:
        try:
            work()
        except BaseException as fault:  # noqa: BLE001 - handed on below
            faults.append(fault)

    thread = threading.Thread(target=run, daemon=True)
    thread.start()
    try:
        while thread.is_alive():
            thread.join(WATCH_SECONDS)
            if thread.is_alive() and halt.is_due():
                stop()
    finally:
        if thread.is_alive():
            stop()
    if faults:
        raise faults[0]
