"""A progress line on stderr: rewritten on a terminal, rare plain lines elsewhere."""

from __future__ import annotations

import shutil
import time
from typing import TYPE_CHECKING, TextIO

from placer.report.words import WIDTH, plain

if TYPE_CHECKING:
    from types import TracebackType

PAUSE_SECONDS = 5.0
"""Least time between two plain lines where stderr is not a terminal."""
TERMINAL_PAUSE_SECONDS = 0.1


class Progress:
    """Say what long work is doing; `progress("placing, 3 of 12")` is one message."""

    def __init__(self, stream: TextIO, *, is_quiet: bool = False) -> None:
        self._stream = stream
        self._is_quiet = is_quiet
        self._is_terminal = stream.isatty()
        # Elsewhere the first line comes only after a pause: short work stays silent.
        self._last = 0.0 if self._is_terminal else time.monotonic()
        self._is_shown = False

    def __call__(self, message: str) -> None:
        """Show a message, unless the last one was shown a moment ago."""
        if self._is_quiet:
            return
        now = time.monotonic()
        pause = TERMINAL_PAUSE_SECONDS if self._is_terminal else PAUSE_SECONDS
        if now - self._last < pause:
            return
        self._last = now
        text = plain(message)
        if self._is_terminal:
            width = shutil.get_terminal_size((WIDTH, 24)).columns
            self._stream.write(f"\r\x1b[K{text[: max(width - 1, 1)]}")
            self._is_shown = True
        else:
            self._stream.write(f"placer: {text}\n")
        self._stream.flush()

    def __enter__(self) -> Progress:
        """Start; nothing is shown before the first message."""
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        """Take the line away, so that what follows starts on a clean one."""
        if self._is_shown:
            self._stream.write("\r\x1b[K")
            self._stream.flush()
