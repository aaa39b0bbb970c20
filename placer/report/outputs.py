"""Put output files in place whole or not at all.

The folders are tested first, every text is written to a temporary file beside its
target, and only when all of them are written is any put in place.
"""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path

from placer.errors import Fault, InputError, Place

STDOUT = "-"


def check_targets(targets: Sequence[str], inputs: Sequence[str] = ()) -> None:
    """Refuse targets that cannot be written, before any long work.

    `-` stands for standard output and is not tested.

    Raises
    ------
    InputError
        With one fault per target: no such folder, a folder in its place, no right to
        write, named twice, or one of the inputs.
    """
    faults: list[Fault] = []
    seen: dict[Path, str] = {}
    read = {_real(name) for name in inputs}
    for target in targets:
        if target == STDOUT:
            continue
        fault = _fault(target)
        real = _real(target)
        if fault is None and real in read:
            fault = ("is-input", f"'{target}' is an input", "choose another name")
        if fault is None and real in seen:
            fault = (
                "named-twice",
                f"'{target}' and '{seen[real]}' are the same file",
                "give each output a file of its own",
            )
        seen.setdefault(real, target)
        if fault is not None:
            faults.append(Fault(Place(target), *fault))
    if faults:
        raise InputError(faults)


def _real(name: str) -> Path:
    return Path(os.path.realpath(name))


def _fault(target: str) -> tuple[str, str, str] | None:
    path = Path(target)
    folder = path.parent
    if not target or (path.exists() and not path.is_file()):
        # A folder, a pipe or a device file must not be replaced by a file.
        return ("not-a-file", f"'{target}' is not the name of a file", "name a file")
    if not folder.is_dir():
        return ("no-folder", f"there is no folder '{folder}'", "make the folder first")
    if not os.access(folder, os.W_OK):
        return (
            "not-writable",
            f"the folder '{folder}' cannot be written to",
            "choose another folder",
        )
    return None


def write_all(texts: Mapping[str, str]) -> None:
    """Write every text to its target, or none of them.

    Raises
    ------
    InputError
        If a file cannot be written; no target has been touched then, unless putting a
        finished file in place is what failed.
    """
    ready: list[tuple[str, str]] = []
    target = ""
    try:
        for target, text in texts.items():
            ready.append((_beside(target, text), target))
        while ready:
            temporary, target = ready[0]
            Path(temporary).replace(_real(target))
            ready.pop(0)
    except OSError as error:
        raise InputError.at(
            Place(target),
            "not-written",
            f"'{target}' could not be written ({error.strerror or error})",
            "free the place or choose another",
        ) from error
    finally:
        for temporary, _ in ready:
            with contextlib.suppress(OSError):
                Path(temporary).unlink()


def _beside(target: str, text: str) -> str:
    """Write a text to a new temporary file in the target's folder."""
    real = _real(target)
    handle, name = tempfile.mkstemp(prefix=f".{real.name}.", dir=real.parent)
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        # mkstemp makes files private; an output gets the rights of its forerunner,
        # or those that any new file would have.
        Path(name).chmod(real.stat().st_mode if real.exists() else 0o666 & ~_umask())
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise
    return name


def _umask() -> int:
    current = os.umask(0o022)
    os.umask(current)
    return current
