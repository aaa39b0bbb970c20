"""List the recipes of a kind of call: needs, counts, source, and a device's figures.

In: a kind, a size, perhaps a device.  Out: rows for people or machines.  Time and error
on a device are those of the recipe alone: nominal times, and gates on the best sites
and links, without a single swap; a plan adds the rest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from placer.errors import InputError, Place, did_you_mean
from placer.planner.profile import profile_of
from placer.program.model import CALL_KINDS, Operation, WireId
from placer.program.signature import ARITHMETIC_KINDS, Signature
from placer.recipes import arithmetic, catalog, library
from placer.recipes.counts import count
from placer.report.words import WIDTH, Page
from placer.tables import device_tables
from placer.units import nats

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Device
    from placer.planner.profile import Profile
    from placer.recipes.circuit import Built
    from placer.tables import Tables

LARGEST = 64
_TABLE_BITS = 4


def example_call(kind: str, size: int) -> Operation:
    """Return a call of a kind: `size` controls, or registers of `size` wires.

    Constants are those with every second bit set; a look-up has `size` address wires
    and a table of four-bit numbers.

    Raises
    ------
    InputError
        If the kind is unknown or the size makes no sense.
    """
    place = Place("--recipes")
    if kind not in CALL_KINDS:
        raise InputError.at(
            place,
            "unknown-kind",
            f"there is no kind of call '{kind}'",
            did_you_mean(kind, CALL_KINDS) or f"kinds: {', '.join(CALL_KINDS)}",
        )
    most = most_of(kind)
    if not 2 <= size <= most:
        raise InputError.at(
            place, "size", f"the size {size} of '{kind}' is not in 2..{most}"
        )
    signature = _signature(kind, size) if kind in ARITHMETIC_KINDS else None
    wires = size + 1 if signature is None else signature.operands
    params = (0.3,) if kind == "mcp" else ()
    return Operation(
        0,
        kind,  # type: ignore[arg-type]
        kind,
        tuple(WireId(w) for w in range(wires)),
        params,
        signature=signature,
    )


def _signature(kind: str, size: int) -> Signature:
    pattern = sum(1 << place for place in range(0, size, 2))
    if kind == "lookup":
        table = tuple(
            (7 * entry + 3) % (1 << _TABLE_BITS) for entry in range(1 << size)
        )
        return Signature(kind, (size, _TABLE_BITS), table=table)
    if kind == "multiply_add":
        return Signature(kind, (size, size, 2 * size))
    if kind == "add_constant":
        return Signature(kind, (size,), constant=pattern)
    widths = {"sum": 3, "increment": 1, "decrement": 1}.get(kind, 2)
    return Signature(kind, (size,) * widths)


def recipe_rows(kind: str, size: int, device: Device | None) -> list[dict[str, Any]]:
    """Return every recipe of a kind as plain data, in the order of the catalog."""
    op = example_call(kind, size)
    tables = None if device is None else device_tables(device)
    rows = []
    for name in library.names_for(op):
        built = library.build_for(name, op)
        sizes = count(built)
        listed = arithmetic if op.signature is not None else catalog
        recipe = listed.describe(name)
        row: dict[str, Any] = {
            "recipe": name,
            "title": recipe.title,
            "workspace": built.workspace,
            "clean": sizes.clean,
            "borrowed": sizes.borrowed,
            "measures": built.needs_measurement,
            "level2_wires": len(built.level2_wires),
            "toffoli": sizes.toffoli,
            "two_body": sizes.two_qubit
            + sizes.two_qubit_conditional
            + sizes.level2_gates,
            "t": sizes.t,
            "t_depth": sizes.t_depth,
            "rotations": sizes.rotations,
            "depth": sizes.depth,
            "toffoli_depth": sizes.toffoli_depth,
            "two_qubit_depth": sizes.two_qubit_depth,
            "measurements": sizes.measurements,
            "live_gates": list(sizes.live_gates),
            "level2_window": sizes.level2_window,
            "source": recipe.source,
            "kept_for": library.kept_for(name),
        }
        if device is not None and tables is not None:
            row |= _on_device(built, device, tables)
        rows.append(row)
    return rows


def _on_device(built: Built, device: Device, tables: Tables) -> dict[str, Any]:
    why = ""
    if built.needs_measurement and not device.capabilities.measured_cleanup:
        why = "no measured cleanup"
    if built.level2_wires and not any(k.level2_ns is not None for k in device.links):
        why = "no level 2"
    if why:
        return {"time_ns": None, "least_error": None, "why_not": why}
    profile = profile_of(built, tables)
    return {
        "time_ns": profile.base_ns,
        "least_error": nats(_least(profile, tables)),
        "why_not": "",
    }


def _least(profile: Profile, tables: Tables) -> int:
    def cheapest(row: Any) -> int:
        return int(row[tables.in_service].min())

    total = sum(pair.count * tables.gate_floor(pair.mask) for pair in profile.pairs)
    total += sum(profile.ones) * cheapest(tables.one)
    total += sum(profile.tees) * cheapest(tables.tee)
    return total + sum(profile.reads) * cheapest(tables.read)


def recipes_text(
    kind: str,
    size: int,
    device: Device | None,
    *,
    width: int = WIDTH,
    colour: bool = False,
) -> str:
    """Return the recipes of a kind as a table, then where each comes from."""
    rows = recipe_rows(kind, size, device)
    page = Page(width, colour=colour)
    title = example_call(kind, size).title
    where = "" if device is None else f" on {device.name}"
    page.paragraph(f"{title}: {len(rows)} recipes{where}", shade="title")
    page.line()
    columns = ["recipe", "needs", "two-body", "T", "depth"]
    columns += ["T depth"] if device is None else ["time", "least error"]
    page.table(columns, [_cells(row, device is not None) for row in rows])
    page.heading("Where they come from")
    for row in rows:
        reason = f" ({row['kept_for']})" if row["kept_for"] else ""
        text = f"{row['recipe']}: {row['title']}{reason}; {row['source']}"
        page.paragraph(text, 1)
    if device is not None:
        page.line()
        page.paragraph(
            "Time and error are those of the recipe alone, at nominal times on the "
            "best sites and links, without swaps or waiting: estimates to compare "
            "recipes."
        )
    return page.text()


def kinds_text(size: int, *, width: int = WIDTH, colour: bool = False) -> str:
    """Return every kind of call with the names of its recipes at a size."""
    page = Page(width, colour=colour)
    page.paragraph("Recipes of every kind of call", shade="title")
    for kind, (at, names) in kinds(size).items():
        page.line()
        page.paragraph(f"{kind}, size {at}: {', '.join(names)}", 1)
    page.line()
    page.paragraph("'placer show KIND --recipes' lists one kind with its counts.")
    return page.text()


def kinds(size: int) -> dict[str, tuple[int, tuple[str, ...]]]:
    """Return per kind the size (the largest possible, at most `size`) and recipes."""
    result = {}
    for kind in CALL_KINDS:
        at = min(size, most_of(kind))
        result[kind] = (at, library.names_for(example_call(kind, at)))
    return result


def most_of(kind: str) -> int:
    """Return the largest size that is listed; tables grow as its power of two."""
    return 8 if kind in ("lookup", "multiply_add") else LARGEST


def _cells(row: dict[str, Any], has_device: bool) -> Sequence[str]:
    needs = [f"{row[k]} {k}" for k in ("clean", "borrowed") if row[k]]
    if row["level2_wires"]:
        needs.append(f"level 2 x {row['level2_wires']}")
    if row["measures"]:
        needs.append("measured")
    turned = "" if not row["rotations"] else f"+{row['rotations']}r"
    cells = [
        row["recipe"],
        ", ".join(needs) or "none",
        str(row["two_body"]),
        f"{row['t']}{turned}",
        str(row["depth"]),
    ]
    if not has_device:
        cells.append(str(row["t_depth"]))
    elif row["time_ns"] is None:
        cells += ["-", row["why_not"]]
    else:
        cells += [f"{row['time_ns'] / 1e3:.3g} us", f"{row['least_error']:.2e}"]
    return cells
