"""Tell devices, programs and plans apart: by name, by file name, by the first keys."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Literal

from placer.device.read import shipped_devices
from placer.errors import InputError, Place, did_you_mean

Sort = Literal["device", "program", "plan"]

_DEVICE_KEY = re.compile(
    r"^(lattice|sites|links|capabilities|calibrated)\s*:", re.MULTILINE
)
_PROGRAM_KEY = re.compile(r"^(registers|steps|routines|program)\s*:", re.MULTILINE)
_QASM = re.compile(r"^\s*(OPENQASM\b|include\b|qreg\b|qubit\b)", re.MULTILINE)


def demo_programs() -> dict[str, Path]:
    """Return the programs that travel with the package, by name, sorted."""
    folder = Path(__file__).parent.parent / "demos"
    found = (p for p in folder.glob("*") if p.suffix in (".qasm", ".yaml", ".yml"))
    return {path.stem: path for path in sorted(found)}


def sort_of(name: str) -> Sort:
    """Return whether a name or a file is a device, a program or a plan.

    Raises
    ------
    InputError
        If there is no such file or name, or its text is neither.
    """
    suffix = Path(name).suffix.lower()
    if suffix == ".qasm":
        return "program"
    path = Path(name)
    if not path.is_file():
        return _by_name(name)
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError.at(
            Place(name), "not-read", f"'{name}' cannot be read as text ({error})"
        ) from error
    if suffix not in (".yaml", ".yml") and _QASM.search(text):
        return "program"
    device, program = _DEVICE_KEY.search(text), _PROGRAM_KEY.search(text)
    if program and not (device and device.start() < program.start()):
        return "program"
    if device:
        return "device"
    if text.lstrip().startswith("{"):
        return "plan"
    raise InputError.at(
        Place(name),
        "neither",
        "this is neither a device nor a program",
        "a device has the keys 'sites' and 'links', a program 'registers' and 'steps'",
    )


def _by_name(name: str) -> Sort:
    devices, demos = shipped_devices(), tuple(demo_programs())
    if name in devices:
        return "device"
    if name in demos:
        return "program"
    known = (
        f"shipped devices: {', '.join(devices)}; demo programs: "
        f"{', '.join(demos) or 'none'}"
    )
    near = did_you_mean(name, (*devices, *demos))
    raise InputError.at(
        Place(name or "(no name)"),
        "not-found",
        f"there is no file, device or demo program '{name}'",
        f"{near} {known}".strip(),
    )
