"""Program YAML to a program; `program-yaml.md` in this folder describes the format.

Steps are read in the `yaml_...` files, cleanup is written out in `yaml_scope`, the
claims about workspace are verified in `claims`.
"""

from __future__ import annotations

from collections.abc import Callable

from placer.errors import Fault, InputError, Place
from placer.program.assemble import assemble
from placer.program.claims import check_claims
from placer.program.draft import Draft
from placer.program.model import Program, Start
from placer.program.yaml_arithmetic import READERS as ARITHMETIC
from placer.program.yaml_block import repeat, scope
from placer.program.yaml_call import mcp, mcx, mcz, product
from placer.program.yaml_operand import NAME, RESERVED
from placer.program.yaml_readout import barrier, measure, reset
from placer.program.yaml_routine import call, read_routines
from placer.program.yaml_step import WIDEST, Steps, TooMany
from placer.yamlnode import Faults, Node
from placer.yamltext import parse

_KEYS = ("name", "note", "registers", "bits", "routines", "steps")
_READERS: dict[str, Callable[[Steps, Node], None]] = {
    "mcx": mcx,
    "mcz": mcz,
    "mcp": mcp,
    "and": product,
    "measure": measure,
    "reset": reset,
    "barrier": barrier,
    "repeat": repeat,
    "scope": scope,
    **ARITHMETIC,
    "call": call,
}
_REGISTER_KEYS = ("width", "start", "lendable", "workspace")


def read_yaml(text: str, path: str, *, open_inputs: bool = False) -> Program:
    """Return the program of a YAML text.

    Raises
    ------
    InputError
        With every fault found in one pass.
    """
    root = _root(text, path)
    faults: Faults = []
    entries = root.mapping(faults, keys=_KEYS, required=("registers", "steps")) or {}
    draft = Draft()
    names: dict[str, tuple[int, ...]] = {}
    owners: dict[int, int] = {}
    if "registers" in entries:
        for key, node in (entries["registers"].mapping(faults) or {}).items():
            place = entries["registers"].key_place(key)
            wires = _register(key, node, place, draft, faults, open_inputs=open_inputs)
            names[key] = wires
            if draft.registers[-1].is_workspace:
                owners.update(dict.fromkeys(wires, -1))
    bits = _bits(entries.get("bits"), draft, faults)
    steps = Steps(draft, names, bits, faults, _READERS)
    steps.owners.update(owners)
    if "routines" in entries:
        read_routines(entries["routines"], faults, _READERS, path, steps.routines)
    _check_names(entries, faults)
    if "steps" in entries:
        try:
            steps.read(entries["steps"])
        except TooMany as error:
            faults.extend(error.faults)
    title = entries["name"].text(faults) if "name" in entries else None
    if "note" in entries:
        entries["note"].text(faults)
    if faults:
        raise InputError(faults)
    draft.steps = steps.out
    program = assemble(
        draft, "yaml", text, path, name=title or "", open_inputs=open_inputs
    )
    check_claims(program)
    return program


def _root(text: str, path: str) -> Node:
    """Return the root node; a bare index in a list gets a help line of its own."""
    try:
        return parse(text, path)
    except InputError as error:
        help = "inside of [...] write a.0 for a[0], or put a[0] in quotes"
        raise InputError(
            Fault(fault.place, fault.code, fault.what, help)
            if "but got '['" in fault.what
            else fault
            for fault in error.faults
        ) from error


def _register(
    name: str,
    node: Node,
    place: Place,
    draft: Draft,
    faults: Faults,
    *,
    open_inputs: bool,
) -> tuple[int, ...]:
    """Read a register: its width alone, or a mapping."""
    start: Start = "unknown"
    is_workspace, is_lendable, width = False, True, None
    if node.is_mapping:
        entries = node.mapping(faults, keys=_REGISTER_KEYS) or {}
        if "width" in entries:
            width = entries["width"].whole(faults, low=1, high=WIDEST)
        if "workspace" in entries:
            is_workspace = bool(entries["workspace"].flag(faults))
        if "lendable" in entries:
            is_lendable = entries["lendable"].flag(faults) is not False
        if "start" in entries:
            word = entries["start"].choice(faults, ("zero", "unknown"))
            start = "zero" if word == "zero" else "unknown"
            if is_workspace and start == "unknown":
                entries["start"].fault(
                    faults, "start", f"workspace '{name}' must start in zero"
                )
    elif not node.is_null:
        width = node.whole(faults, low=1, high=WIDEST)
    if is_workspace:
        start = "zero"
    elif open_inputs:
        start = "unknown"
    return draft.add_register(
        name,
        width,
        start,
        place,
        is_workspace=is_workspace,
        is_lendable=is_lendable,
    )


def _bits(
    node: Node | None, draft: Draft, faults: Faults
) -> dict[str, tuple[str, ...]]:
    """Read classical registers: a width each, or nothing for a single bit."""
    result: dict[str, tuple[str, ...]] = {}
    if node is None:
        return result
    for name, value in (node.mapping(faults) or {}).items():
        if value.is_null:
            draft.bits.append((name, 0))
            result[name] = (name,)
            continue
        width = value.whole(faults, low=1, high=WIDEST) or 1
        draft.bits.append((name, width))
        result[name] = tuple(f"{name}[{i}]" for i in range(width))
    return result


def _check_names(entries: dict[str, Node], faults: Faults) -> None:
    """Refuse names that no operand could be written with, or that stand twice."""
    seen: set[str] = set()
    for group in ("registers", "bits"):
        node = entries.get(group)
        if node is None or not node.is_mapping:
            continue
        for key, _ in node.entries:
            if not NAME.fullmatch(key.value) or key.value in RESERVED:
                key.fault(
                    faults,
                    "name",
                    f"{key.shown} cannot name a register",
                    "use letters, digits and _, not 'all' or 'not'",
                )
            elif group == "bits" and key.value in seen:
                what = f"{key.shown} names a quantum register already"
                key.fault(faults, "declared-twice", what)
            seen.add(key.value)
