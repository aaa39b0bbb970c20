"""Scopes and repetition in program YAML."""

from __future__ import annotations

from placer.errors import Fault, Place
from placer.program.draft import DraftScope, Part, Step
from placer.program.yaml_operand import NAME, RESERVED
from placer.program.yaml_scope import body_faults, mirror
from placer.program.yaml_step import WIDEST, Steps, TooMany, wire_names
from placer.yamlnode import Node

MOST_TIMES = 1_000_000
MOST_WIRES = 1_000_000


def repeat(steps: Steps, node: Node) -> None:
    """Write steps out several times."""
    entries = node.mapping(
        steps.faults, keys=("times", "steps"), required=("times", "steps")
    )
    if entries is None or len(entries) < 2:
        return
    times = entries["times"].whole(steps.faults, low=0, high=MOST_TIMES)
    for _ in range(times or 0):
        steps.count_turn(node.place)
        before = len(steps.faults)
        steps.read(entries["steps"])
        if len(steps.faults) > before:
            # The other turns would repeat these faults.
            return


def scope(steps: Steps, node: Node) -> None:
    """Compute, do the body, and take back what was computed."""
    entries = node.mapping(
        steps.faults,
        keys=("name", "workspace", "compute", "body"),
        required=("compute", "body"),
    )
    if entries is None:
        return
    number = len(steps.draft.scopes)
    parent, part = steps.open[-1] if steps.open else (-1, "")
    name = _scope_name(steps, entries.get("name"))
    steps.draft.scopes.append(DraftScope(number, parent, part, name, node.place))
    before = dict(steps.names)
    try:
        if "workspace" in entries:
            add_workspace(steps, entries["workspace"], number)
        compute = read_part(steps, number, "compute", entries.get("compute"))
        body = read_part(steps, number, "body", entries.get("body"))
    finally:
        steps.names = before
    steps.faults.extend(body_faults(compute, body, lambda: wire_names(steps.draft)))

    def fresh(old: int, new: int) -> dict[int, int]:
        return _fresh(steps, old, new)

    cleanup = mirror(steps.draft, compute, number, fresh)
    steps.count_turn(node.place, len(cleanup))
    steps.out.extend([*compute, *body, *cleanup])


def _scope_name(steps: Steps, node: Node | None) -> str:
    name = node.text(steps.faults) if node is not None else None
    if node is not None and name is not None and not NAME.fullmatch(name):
        node.fault(
            steps.faults,
            "name",
            f"{node.shown} is not a name",
            "use letters, digits and _",
        )
    return name or ""


def read_part(steps: Steps, number: int, part: Part, node: Node | None) -> list[Step]:
    """Read one part of a scope into a list of its own."""
    if node is None:
        return []
    saved = steps.out
    steps.out = []
    steps.open.append((number, part))
    try:
        steps.read(node)
        return steps.out
    finally:
        steps.open.pop()
        steps.out = saved


def add_workspace(steps: Steps, node: Node, number: int) -> None:
    """Declare the workspace of a scope, under names that are free outside."""
    for name, value in (node.mapping(steps.faults) or {}).items():
        width = value.whole(steps.faults, low=1, high=WIDEST)
        place = node.key_place(name)
        if not NAME.fullmatch(name) or name in RESERVED:
            what = f"'{name[:60]}' cannot name a register"
            steps.faults.append(Fault(place, "name", what))
        elif name in steps.names:
            steps.faults.append(
                Fault(
                    place,
                    "declared-twice",
                    f"the workspace '{name}' has the name of a register in sight",
                    "choose another name",
                )
            )
        else:
            steps.names[name] = _register(steps, name, width or 1, number, place)


def _register(
    steps: Steps, name: str, width: int, scope: int, place: Place
) -> tuple[int, ...]:
    if steps.draft.wires + width > MOST_WIRES:
        what = f"the program needs more than {MOST_WIRES} qubits"
        raise TooMany([Fault(place, "too-large", what)])
    # Numbers are unique, and no register of the source has a dot in its name.
    base = steps.draft.scopes[scope].name or "scope"
    joint = "" if base == "scope" else "_"
    full = f"{base}{joint}{scope + 1}.{name}"
    wires = steps.draft.add_register(full, width, "zero", place, is_workspace=True)
    steps.owners.update(dict.fromkeys(wires, scope))
    steps.workspace_of.setdefault(scope, []).append(len(steps.draft.registers) - 1)
    return wires


def _fresh(steps: Steps, old: int, new: int) -> dict[int, int]:
    """Give the copy of a scope workspace of its own."""
    moved: dict[int, int] = {}
    for index in steps.workspace_of.get(old, ()):
        register = steps.draft.registers[index]
        short = register.name.rsplit(".", 1)[-1]
        wires = _register(steps, short, register.width, new, register.place)
        moved.update({register.first + i: wire for i, wire in enumerate(wires)})
    return moved
