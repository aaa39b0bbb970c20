"""Device YAML to a `Device`, and the devices that travel with the package.

Everything a file can have wrong is reported in one pass as an `InputError`.  Figures
are read in `figures`, the coupling graph in `read_lattice`, sites and links are put
together in `assemble`.
"""

from __future__ import annotations

import datetime
import hashlib
import re
from pathlib import Path

from placer.device.assemble import Stated, build_links, build_sites, check_connected
from placer.device.figures import (
    LINK_FIGURES,
    LINK_LEVEL2,
    LONGEST_US,
    SITE_FIGURES,
    SITE_LEVEL2,
    T_GATE_FIGURES,
    Figures,
    check_lifetimes,
    read_figures,
    read_time,
)
from placer.device.lattices import Lattice, Pair
from placer.device.model import Budget, Capabilities, Device, TGate
from placer.device.read_lattice import read_lattice, read_link, read_site, read_sites
from placer.errors import InputError, Place, did_you_mean
from placer.units import ticks_down, ticks_up
from placer.yamltext import LARGEST_TEXT, Faults, Node, parse, raise_if_any

_KEYS = (
    "name",
    "note",
    "calibrated",
    "lattice",
    "sites",
    "links",
    "site_overrides",
    "link_overrides",
    "out_of_order",
    "capabilities",
    "t_gate",
    "budget",
    "allow_disconnected",
)
_REQUIRED = ("name", "calibrated", "lattice", "sites", "links", "capabilities")
_NEEDED_OF_SITES = tuple(
    key for key in SITE_FIGURES if key[:5] not in ("reset", "prep_")
)
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,63}")


def shipped_devices() -> tuple[str, ...]:
    """Return the names of the devices that travel with the package, sorted."""
    folder = _shipped_folder()
    return tuple(sorted(path.stem for path in folder.glob("*.yaml")))


def find_device(name_or_path: str) -> Device:
    """Return a shipped device by name, or read the file that a path names.

    A path ends in `.yaml` or `.yml` or has a folder in it.

    Raises
    ------
    InputError
        If there is no such device, the file cannot be read, or it has faults.

    Examples
    --------
    >>> find_device("slate-16").lattice
    'grid of 4 x 4'
    """
    text = name_or_path.strip()
    shipped = shipped_devices()
    if text in shipped:
        device = read_device(_text_of(_shipped_folder() / f"{text}.yaml", text), text)
        if device.name != text:
            raise InputError.at(
                Place(f"{text}.yaml"),
                "wrong-name",
                f"the device calls itself '{device.name}'",
                f"a shipped device has the name of its file, '{text}'",
            )
        return device
    if Path(text).suffix in (".yaml", ".yml") or "/" in text or "\\" in text:
        return read_device(_text_of(Path(text), name_or_path), name_or_path)
    raise InputError.at(
        Place(name_or_path or "(no name)"),
        "unknown-device",
        f"there is no device '{name_or_path}'",
        " ".join(
            part
            for part in (
                did_you_mean(text, shipped),
                f"shipped devices: {', '.join(shipped)};",
                "a file of your own needs its full path, such as ./mine.yaml",
            )
            if part
        ),
    )


def read_device(text: str, path: str) -> Device:
    """Return the device that a YAML text describes; `path` is named in messages.

    Raises
    ------
    InputError
        With every fault of the text.
    """
    faults: Faults = []
    root = parse(text, path)
    fields = root.mapping(faults, keys=_KEYS, required=_REQUIRED)
    if fields is None:
        raise InputError(faults)
    name = _read_name(faults, fields)
    note = fields["note"].text(faults) if "note" in fields else ""
    calibrated = _read_date(faults, fields)
    is_split_allowed = (
        fields["allow_disconnected"].flag(faults)
        if "allow_disconnected" in fields
        else False
    )
    lattice = read_lattice(faults, fields["lattice"]) if "lattice" in fields else None
    capabilities = _read_capabilities(faults, fields, lattice)
    stated = _read_stated(faults, fields, lattice, capabilities)
    t_gate = _read_t_gate(faults, fields)
    budget = _read_budget(faults, fields)
    if lattice is None or capabilities is None or stated is None:
        raise InputError(faults)
    sites = build_sites(faults, lattice, stated)
    links = build_links(faults, lattice, stated)
    if not is_split_allowed:
        check_connected(faults, lattice, stated)
    raise_if_any(faults)
    return Device(
        name=name or "",
        note=" ".join((note or "").split()),
        calibrated=calibrated or "",
        lattice=lattice.words,
        sites=sites,
        links=links,
        capabilities=capabilities[0],
        t_gate=t_gate,
        budget=budget,
        text=text,
        path=path,
        hash=hashlib.sha256(text.encode()).hexdigest(),
        link_at={(link.a, link.b): link for link in links},
    )


def _shipped_folder() -> Path:
    package = Path(__file__).resolve().parent.parent
    installed = package / "shipped_devices"
    return installed if installed.is_dir() else package.parent / "devices"


def _text_of(path: Path, shown: str) -> str:
    """Return the text of a file, line ends as they stand; its troubles are faults."""
    try:
        size = path.stat().st_size if path.is_file() else None
        if size is not None and size <= 4 * LARGEST_TEXT:
            return path.read_bytes().decode("utf-8")
        reason = "too large" if size else "no such file"
    except UnicodeDecodeError as error:
        reason = f"not a text in UTF-8 (byte {error.start})"
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
    raise InputError.at(
        Place(shown or "(no name)"),
        "unreadable-file",
        f"cannot read '{shown}': {reason}",
    )


def _read_name(faults: Faults, fields: dict[str, Node]) -> str | None:
    name = fields["name"].text(faults) if "name" in fields else None
    if name is not None and not _NAME.fullmatch(name):
        fields["name"].fault(
            faults,
            "bad-name",
            f"the name {fields['name'].shown} is no plain word",
            "use letters, digits, '-', '_' and '.', at most 64",
        )
    return name


def _read_date(faults: Faults, fields: dict[str, Node]) -> str | None:
    date = fields["calibrated"].text(faults) if "calibrated" in fields else None
    if date is None:
        return None
    try:
        is_date = datetime.date.fromisoformat(date).isoformat() == date
    except ValueError:
        is_date = False
    if not is_date:
        fields["calibrated"].fault(
            faults,
            "bad-date",
            f"calibrated is {fields['calibrated'].shown}, not a date",
            "write year-month-day, such as 2026-03-02",
        )
    return date


_Level2Sites = tuple[int, ...] | None


def _read_capabilities(
    faults: Faults, fields: dict[str, Node], lattice: Lattice | None
) -> tuple[Capabilities, _Level2Sites] | None:
    """Return the capabilities and the sites with level 2, `None` where not stated."""
    if "capabilities" not in fields:
        return None
    needed = ("mid_circuit_measurement", "conditional_latency_ns", "reset")
    found = fields["capabilities"].mapping(
        faults, keys=(*needed, "level2_sites"), required=needed
    )
    if found is None:
        return None
    flags = {
        key: found[key].flag(faults)
        for key in ("mid_circuit_measurement", "reset")
        if key in found
    }
    latency: int | None = None
    if "conditional_latency_ns" in found:
        node = found["conditional_latency_ns"]
        if not _says(node, "none"):
            latency = read_time(faults, node)
            if flags.get("mid_circuit_measurement") is False:
                node.fault(
                    faults,
                    "no-measurement",
                    "conditional gates need mid-circuit measurement, which is false",
                    "write conditional_latency_ns: none",
                )
    level2: _Level2Sites = None
    if "level2_sites" in found and lattice is not None:
        level2 = _read_level2_sites(faults, found["level2_sites"], lattice)
    return (
        Capabilities(
            mid_circuit_measurement=bool(flags.get("mid_circuit_measurement")),
            conditional_ns=latency,
            reset=bool(flags.get("reset")),
        ),
        level2,
    )


def _read_level2_sites(faults: Faults, node: Node, lattice: Lattice) -> tuple[int, ...]:
    if _says(node, "none"):
        return ()
    if _says(node, "all"):
        return tuple(range(lattice.count))
    if node.is_sequence:
        return tuple(read_sites(faults, node, lattice.count))
    node.fault(
        faults,
        "wrong-type",
        f"level2_sites is {node.shown}",
        "write all, none or a list of sites",
    )
    return ()


def _says(node: Node, word: str) -> bool:
    return node.is_scalar and node.value == word


def _read_stated(
    faults: Faults,
    fields: dict[str, Node],
    lattice: Lattice | None,
    capabilities: tuple[Capabilities, _Level2Sites] | None,
) -> Stated | None:
    """Return all figures of sites and links as stated, defaults and overrides."""
    site_default: Figures = {}
    link_default: Figures = {}
    if "sites" in fields:
        needed = _NEEDED_OF_SITES
        if capabilities is not None and capabilities[0].reset:
            needed = (*needed, "reset_error", "reset_time_ns")
        site_default = read_figures(
            faults,
            fields["sites"],
            plain=SITE_FIGURES,
            level2=SITE_LEVEL2,
            required=needed,
        )
        check_lifetimes(faults, site_default, "the sites")
    if "links" in fields:
        link_default = read_figures(
            faults,
            fields["links"],
            plain=LINK_FIGURES,
            level2=LINK_LEVEL2,
            required=tuple(LINK_FIGURES),
        )
    if lattice is None or capabilities is None:
        return None
    out_of_order: list[int] = []
    if "out_of_order" in fields:
        out_of_order = read_sites(faults, fields["out_of_order"], lattice.count)
    place = fields.get("out_of_order", fields["lattice"]).place
    level2_place = fields["capabilities"].place
    for key, value in fields["capabilities"].entries:
        if key.value == "level2_sites":
            level2_place = value.place
    return Stated(
        site_default=site_default,
        link_default=link_default,
        of_site=_site_overrides(faults, fields, lattice),
        of_link=_link_overrides(faults, fields, lattice),
        level2_sites=capabilities[1],
        level2_place=level2_place,
        out_of_order=tuple(out_of_order),
        graph_place=place,
    )


def _site_overrides(
    faults: Faults, fields: dict[str, Node], lattice: Lattice
) -> dict[int, Figures]:
    found: dict[int, Figures] = {}
    if "site_overrides" not in fields:
        return found
    node = fields["site_overrides"]
    node.mapping(faults)  # says what is repeated
    for key, value in node.entries:
        site = read_site(faults, key, lattice.count)
        if site is not None:
            found[site] = read_figures(
                faults, value, plain=SITE_FIGURES, level2=SITE_LEVEL2
            )
    return found


def _link_overrides(
    faults: Faults, fields: dict[str, Node], lattice: Lattice
) -> dict[Pair, Figures]:
    found: dict[Pair, Figures] = {}
    if "link_overrides" not in fields:
        return found
    node = fields["link_overrides"]
    node.mapping(faults)
    words: dict[Pair, str] = {}
    for key, value in node.entries:
        pair = read_link(faults, key, lattice)
        if pair is None:
            continue
        if words.setdefault(pair, key.value) != key.value:
            key.fault(
                faults,
                "repeated-link",
                f"{key.value} and {words[pair]} are the same link",
                "keep one of them",
            )
        found[pair] = read_figures(
            faults, value, plain=LINK_FIGURES, level2=LINK_LEVEL2
        )
    return found


def _read_t_gate(faults: Faults, fields: dict[str, Node]) -> TGate | None:
    if "t_gate" not in fields or _says(fields["t_gate"], "none"):
        return None
    figures = read_figures(
        faults, fields["t_gate"], plain=T_GATE_FIGURES, required=tuple(T_GATE_FIGURES)
    )
    error, time = figures.get("error"), figures.get("time_ns")
    if error is None or time is None or error.value is None or time.value is None:
        return None
    return TGate(error.value, ticks_up(time.value))


def _read_budget(faults: Faults, fields: dict[str, Node]) -> Budget:
    keys = ("share", "least_success", "most_sites", "longest_us")
    found = fields["budget"].mapping(faults, keys=keys) if "budget" in fields else None
    if not found:
        return Budget()
    usual = Budget()
    share: float | None = usual.share
    success = most = longest = None
    if "share" in found:
        share = found["share"].number(faults, above=0.0, high=100.0)
    if "least_success" in found:
        success = found["least_success"].number(faults, low=0.0, below=1.0)
    if "most_sites" in found:
        most = found["most_sites"].whole(faults, low=1)
    if "longest_us" in found:
        longest = found["longest_us"].number(faults, low=0.001, high=LONGEST_US)
    return Budget(
        share=usual.share if share is None else share,
        least_success=success,
        most_sites=most,
        longest_ns=None if longest is None else ticks_down(longest * 1e3),
    )
