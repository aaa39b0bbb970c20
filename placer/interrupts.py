"""Turn Ctrl-C and the end of the allowed time into an early, orderly end.

The first Ctrl-C asks the work to end with what it has; a second one leaves at once.
Where work cannot end in time, the command gives up with its exit status.
"""

from __future__ import annotations

import contextlib
import signal
import threading
import time
from typing import TYPE_CHECKING, Any

from placer.errors import OutOfTime

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from placer.halt import Halt

GRACE = 0.05
"""Part of the limit after which the command gives up."""


@contextlib.contextmanager
def stoppable(halt: Halt, say: Callable[[str], object]) -> Iterator[None]:
    """Let signals end the work inside; elsewhere than in the main thread do nothing.

    Raises
    ------
    OutOfTime
        Inside, when the limit and a little more is over.
    KeyboardInterrupt
        Inside, at the second Ctrl-C.
    """
    if threading.current_thread() is not threading.main_thread():
        yield
        return

    def on_interrupt(_number: int, _frame: Any) -> None:
        if halt.why:
            raise KeyboardInterrupt
        halt.interrupt()
        say("ending with the best plan so far; Ctrl-C again leaves without one")

    def on_alarm(_number: int, _frame: Any) -> None:
        raise OutOfTime(
            f"no checked plan within the wall-clock limit of {halt.seconds:g} s"
        )

    before = signal.signal(signal.SIGINT, on_interrupt)
    has_alarm = halt.seconds is not None and hasattr(signal, "SIGALRM")
    if has_alarm and halt.seconds is not None:
        passed = time.monotonic() - halt.begun
        signal.signal(signal.SIGALRM, on_alarm)
        left = halt.seconds * (1.0 + GRACE) - passed
        signal.setitimer(signal.ITIMER_REAL, max(left, 0.001))
    try:
        yield
    finally:
        if has_alarm:
            signal.setitimer(signal.ITIMER_REAL, 0.0)
            signal.signal(signal.SIGALRM, signal.SIG_DFL)
        signal.signal(signal.SIGINT, before)
