"""Steps of program YAML to operations: gates, calls, scopes, repetition."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

from placer.errors import Fault, InputError, Place, did_you_mean
from placer.program.draft import Draft, DraftScope, Part, Step
from placer.program.lowering import lower
from placer.program.model import PLAIN_GATES, OperationKind
from placer.program.terms import Term
from placer.program.yaml_operand import NAME, Operand, angle, operands
from placer.program.yaml_scope import body_faults, mirror
from placer.yamlnode import Node, raise_if_any

MOST_STEPS = 1_000_000
MOST_TIMES = 1_000_000
MOST_WIRES = 1_000_000
MOST_FAULTS = 200
WIDEST = 100_000


class TooMany(InputError):  # noqa: N818 - a fault that ends the pass
    """The program becomes too large to go on reading."""


@dataclass(slots=True)
class Steps:
    """Where the reading of steps stands.

    `names` are the registers in sight, `open` the scopes and parts around the step,
    `out` the list that steps are added to.
    """

    draft: Draft
    names: dict[str, tuple[int, ...]]
    bits: dict[str, tuple[str, ...]]
    faults: list[Fault]
    open: list[tuple[int, Part]] = field(default_factory=list)
    out: list[Step] = field(default_factory=list)
    owners: dict[int, int] = field(default_factory=dict)
    workspace_of: dict[int, list[int]] = field(default_factory=dict)
    count: int = 0

    def read(self, node: Node) -> None:
        """Read a list of steps."""
        for item in node.sequence(self.faults) or ():
            self._count_turn(item.place)
            try:
                self._step(item)
            except TooMany:
                raise
            except InputError as error:
                self.faults.extend(error.faults)
            if len(self.faults) > MOST_FAULTS:
                raise TooMany(())

    def _step(self, item: Node) -> None:
        entries = item.mapping(self.faults)
        if entries is None:
            return
        if len(entries) != 1:
            item.fault(
                self.faults,
                "step",
                f"a step has one key, found {len(entries)}",
                "begin each step with '- ', such as '- h: a'",
            )
            return
        key = item.entries[0][0]
        value = entries[key.value]
        if value.is_mapping:
            # The step stands where its key does, not where its first detail does.
            value = replace(value, place=key.place)
        reader = _READERS.get(key.value)
        if reader is not None:
            reader(self, value)
        elif key.value in PLAIN_GATES:
            self._gate(key.value, value, key.place)
        else:
            known = sorted([*_READERS, *PLAIN_GATES])
            help = did_you_mean(key.value, known)
            if key.value in ("ccx", "ccz"):
                help = f"write 'mc{key.value[-1]}' with controls and target"
            key.fault(self.faults, "unknown-step", f"unknown step {key.shown}", help)

    def _count_turn(self, place: Place, added: int = 1) -> None:
        self.count += added
        if self.count > MOST_STEPS:
            what = f"the program expands to more than {MOST_STEPS} steps"
            raise TooMany([Fault(place, "too-large", what)])

    def _add(
        self,
        kind: OperationKind,
        wires: Sequence[int],
        place: Place,
        *,
        name: str = "",
        params: tuple[float, ...] = (),
        bit: str | None = None,
        is_frame: bool = False,
    ) -> None:
        """Add an operation, which must act on different wires."""
        if len(set(wires)) < len(wires):
            wire = next(w for i, w in enumerate(wires) if w in wires[:i])
            names = wire_names(self.draft)
            raise InputError.at(
                place,
                "same-qubit",
                f"'{name or kind}' gets the same qubit twice: '{names[wire]}'",
            )
        scope, part = self.open[-1] if self.open else (-1, "")
        self._count_turn(place)
        self.out.append(
            Step(
                kind,
                name or kind,
                tuple(wires),
                params,
                place,
                bit=bit,
                scope=scope,
                part=part,
                is_frame=is_frame,
            )
        )

    def _plain(self, node: Node) -> list[Operand]:
        """Return operands of which none is a control on 0."""
        found = operands(node, self.names)
        for operand in found:
            if operand.on_zero:
                raise InputError.at(
                    operand.place, "operand", "only a control may act on 0"
                )
        return found

    def _gate(self, name: str, node: Node, place: Place) -> None:
        width, count = PLAIN_GATES[name]
        params: tuple[float, ...] = ()
        on = node
        if count:
            key = "angle" if count == 1 else "angles"
            entries = node.mapping(self.faults, keys=(key, "on"), required=(key, "on"))
            if entries is None or len(entries) < 2:
                return
            on = entries["on"]
            params = _angles(entries[key], count)
        found = self._plain(on)
        if width == 1:
            for operand in found:
                for wire in operand.wires:
                    self._add("gate", (wire,), place, name=name, params=params)
            return
        if len(found) != 2:
            raise InputError.at(
                on.place,
                "operand-count",
                f"'{name}' acts on 2 qubits or registers, found {len(found)}",
            )
        sizes = [len(operand.wires) for operand in found if not operand.is_single]
        if len(set(sizes)) > 1:
            raise InputError.at(
                on.place,
                "broadcast",
                f"the registers of '{name}' have widths {sizes[0]} and {sizes[1]}",
                "registers in one step must have the same width",
            )
        for turn in range(sizes[0] if sizes else 1):
            wires = [op.wires[0 if op.is_single else turn] for op in found]
            self._add("gate", wires, place, name=name, params=params)

    def _call(self, base: str, node: Node, target_key: str) -> None:
        """Read a call: controls and a target, or for phases just the qubits `on`."""
        keys = ["controls", target_key]
        if base == "p":
            keys.append("angle")
        if base in ("z", "p"):
            keys.append("on")
        entries = node.mapping(self.faults, keys=keys)
        if entries is None:
            return
        params: tuple[float, ...] = ()
        if base == "p":
            if "angle" not in entries:
                raise InputError.at(
                    node.place, "missing-key", f"{node.label} needs the key 'angle'"
                )
            params = (angle(entries["angle"]),)
        wires, zeros = self._call_wires(entries, target_key, node)
        self._emit(base, params, wires, zeros, node.place)

    def _call_wires(
        self, entries: dict[str, Node], target_key: str, node: Node
    ) -> tuple[list[int], list[int]]:
        """Return controls and target, and the wires that act on 0."""
        if "on" in entries:
            if len({"controls", target_key} & set(entries)) > 0:
                raise InputError.at(
                    node.place,
                    "step",
                    f"{node.label} has 'on' as well as controls or a target",
                    "keep one of the two forms",
                )
            controls, target = operands(entries["on"], self.names), []
        else:
            for key in ("controls", target_key):
                if key not in entries:
                    raise InputError.at(
                        node.place, "missing-key", f"{node.label} needs the key '{key}'"
                    )
            controls = operands(entries["controls"], self.names)
            target = self._plain(entries[target_key])
            if sum(len(operand.wires) for operand in target) != 1:
                raise InputError.at(
                    entries[target_key].place,
                    "operand-count",
                    f"the {target_key} of {node.label} must be one qubit",
                )
        both = [*controls, *target]
        wires = [wire for operand in both for wire in operand.wires]
        zeros = [wire for operand in both if operand.on_zero for wire in operand.wires]
        return wires, zeros

    def _emit(
        self,
        base: str,
        params: tuple[float, ...],
        wires: list[int],
        zeros: list[int],
        place: Place,
    ) -> None:
        if len(wires) < 2:
            raise InputError.at(place, "operand-count", "a call needs a control")
        for wire in sorted(set(zeros)):
            self._add("gate", (wire,), place, name="x", is_frame=True)
        if base == "and":
            self._add("and", wires, place)
        else:
            places = tuple(range(len(wires)))
            term = Term(base, params, places[:-1], places[-1:])
            for raw in lower((term,)):
                local = [wires[i] for i in raw.wires]
                self._add(raw.kind, local, place, name=raw.name, params=raw.params)
        for wire in sorted(set(zeros)):
            self._add("gate", (wire,), place, name="x", is_frame=True)

    def mcx(self, node: Node) -> None:
        """Flip a target where all controls are 1."""
        self._call("x", node, "target")

    def mcz(self, node: Node) -> None:
        """Change the sign where all qubits are 1."""
        self._call("z", node, "target")

    def mcp(self, node: Node) -> None:
        """Give a phase where all qubits are 1."""
        self._call("p", node, "target")

    def product(self, node: Node) -> None:
        """Compute the product of at least two qubits into workspace."""
        entries = node.mapping(
            self.faults, keys=("controls", "into"), required=("controls", "into")
        )
        if entries is None or len(entries) < 2:
            return
        wires, zeros = self._call_wires(entries, "into", node)
        if len(wires) < 3:
            raise InputError.at(
                entries["controls"].place,
                "operand-count",
                f"'and' needs at least two controls, found {len(wires) - 1}",
                "copy one qubit with cx",
            )
        self._need_workspace(wires[-1], entries["into"])
        self._emit("and", (), wires, zeros, node.place)

    def _need_workspace(self, wire: int, node: Node) -> None:
        """Refuse an `and` that no scope takes back, or into a wire with a value."""
        if wire not in self.owners:
            raise InputError.at(
                node.place,
                "and-target",
                f"the target {node.shown} of 'and' is not workspace",
                "use workspace of a scope, or mcx for any other wire",
            )
        owner = self.owners[wire]
        inside = [number for number, _ in self.open]
        start = inside.index(owner) if owner in inside else 0
        if not any(part == "compute" for _, part in self.open[start:]):
            raise InputError.at(
                node.place,
                "and-outside",
                "'and' stands outside of a compute part, so that nothing takes it back",
                "move it into the compute part of a scope",
            )

    def measure(self, node: Node) -> None:
        """Measure qubits, into bits of the same number if there are any."""
        self._refuse_in_compute("measure", node)
        source, target = node, None
        if node.is_mapping:
            entries = node.mapping(
                self.faults, keys=("from", "into"), required=("from",)
            )
            if not entries or "from" not in entries:
                return
            source, target = entries["from"], entries.get("into")
        wires = [w for operand in self._plain(source) for w in operand.wires]
        bits: Sequence[str | None] = [None] * len(wires)
        if target is not None:
            bits = self._target_bits(target, len(wires))
        for wire, bit in zip(wires, bits, strict=True):
            self._add("measure", (wire,), node.place, bit=bit)

    def _target_bits(self, node: Node, count: int) -> list[str]:
        numbers = {
            name: tuple(range(len(bits))) for name, bits in sorted(self.bits.items())
        }
        result: list[str] = []
        for piece in node.items if node.is_sequence else (node,):
            for operand in operands(piece, numbers):
                name = piece.value.split("[")[0].split(".")[0].strip()
                result.extend(self.bits[name][place] for place in operand.wires)
        if len(result) != count:
            raise InputError.at(
                node.place,
                "broadcast",
                f"the measurement gives {count} results, {node.label} takes "
                f"{len(result)}",
            )
        return result

    def reset(self, node: Node) -> None:
        """Bring qubits to |0>."""
        self._refuse_in_compute("reset", node)
        for operand in self._plain(node):
            for wire in operand.wires:
                self._add("reset", (wire,), node.place)

    def barrier(self, node: Node) -> None:
        """Order steps on some qubits, or on all that are in sight."""
        if node.is_scalar and node.value == "all":
            wires = sorted(wire for found in self.names.values() for wire in found)
        else:
            wires = [w for operand in self._plain(node) for w in operand.wires]
        self._add("barrier", wires, node.place)

    def _refuse_in_compute(self, what: str, node: Node) -> None:
        if any(part == "compute" for _, part in self.open):
            raise InputError.at(
                node.place,
                "not-invertible",
                f"'{what}' stands in a compute part and cannot be taken back",
                "move it into the body or out of the scope",
            )

    def repeat(self, node: Node) -> None:
        """Write steps out several times."""
        entries = node.mapping(
            self.faults, keys=("times", "steps"), required=("times", "steps")
        )
        if entries is None or len(entries) < 2:
            return
        times = entries["times"].whole(self.faults, low=0, high=MOST_TIMES)
        for _ in range(times or 0):
            self._count_turn(node.place)
            before = len(self.faults)
            self.read(entries["steps"])
            if len(self.faults) > before:
                # The other turns would repeat these faults.
                return

    def scope(self, node: Node) -> None:
        """Compute, do the body, and take back what was computed."""
        entries = node.mapping(
            self.faults,
            keys=("name", "workspace", "compute", "body"),
            required=("compute", "body"),
        )
        if entries is None:
            return
        number = len(self.draft.scopes)
        parent, part = self.open[-1] if self.open else (-1, "")
        name = self._scope_name(entries.get("name"))
        self.draft.scopes.append(DraftScope(number, parent, part, name, node.place))
        before = dict(self.names)
        try:
            if "workspace" in entries:
                self._workspace(entries["workspace"], number)
            compute = self._part(number, "compute", entries.get("compute"))
            body = self._part(number, "body", entries.get("body"))
        finally:
            self.names = before
        names = wire_names(self.draft)
        self.faults.extend(body_faults(compute, body, names))
        cleanup = mirror(self.draft, compute, number, self.workspace_of, self._fresh)
        self._count_turn(node.place, len(cleanup))
        self.out.extend([*compute, *body, *cleanup])

    def _scope_name(self, node: Node | None) -> str:
        name = node.text(self.faults) if node is not None else None
        if node is not None and name is not None and not NAME.fullmatch(name):
            node.fault(
                self.faults,
                "name",
                f"{node.shown} is not a name",
                "use letters, digits and _",
            )
        return name or ""

    def _part(self, number: int, part: Part, node: Node | None) -> list[Step]:
        """Read one part of a scope into a list of its own."""
        if node is None:
            return []
        saved = self.out
        self.out = []
        self.open.append((number, part))
        try:
            self.read(node)
            return self.out
        finally:
            self.open.pop()
            self.out = saved

    def _workspace(self, node: Node, number: int) -> None:
        """Declare the workspace of a scope, under names that are free outside."""
        for name, value in (node.mapping(self.faults) or {}).items():
            width = value.whole(self.faults, low=1, high=WIDEST)
            place = node.key_place(name)
            if not NAME.fullmatch(name) or name in RESERVED:
                what = f"'{name[:60]}' cannot name a register"
                self.faults.append(Fault(place, "name", what))
            elif name in self.names:
                self.faults.append(
                    Fault(
                        place,
                        "declared-twice",
                        f"the workspace '{name}' has the name of a register in sight",
                        "choose another name",
                    )
                )
            else:
                self.names[name] = self._register(name, width or 1, number, place)

    def _register(
        self, name: str, width: int, scope: int, place: Place
    ) -> tuple[int, ...]:
        if self.draft.wires + width > MOST_WIRES:
            what = f"the program needs more than {MOST_WIRES} qubits"
            raise TooMany([Fault(place, "too-large", what)])
        # Numbers are unique, and no register of the source has a dot in its name.
        base = self.draft.scopes[scope].name or "scope"
        joint = "" if base == "scope" else "_"
        full = f"{base}{joint}{scope + 1}.{name}"
        wires = self.draft.add_register(full, width, "zero", place, is_workspace=True)
        self.owners.update(dict.fromkeys(wires, scope))
        self.workspace_of.setdefault(scope, []).append(len(self.draft.registers) - 1)
        return wires

    def _fresh(self, old: int, new: int) -> dict[int, int]:
        """Give the copy of a scope workspace of its own."""
        moved = {}
        for index in self.workspace_of[old]:
            register = self.draft.registers[index]
            short = register.name.rsplit(".", 1)[-1]
            wires = self._register(short, register.width, new, register.place)
            moved.update({register.first + i: wire for i, wire in enumerate(wires)})
        return moved


def wire_names(draft: Draft) -> list[str]:
    """Return the names of all wires so far."""
    return [
        register.name if register.is_single else f"{register.name}[{i}]"
        for register in draft.registers
        for i in range(register.width)
    ]


def _angles(node: Node, count: int) -> tuple[float, ...]:
    if count == 1:
        return (angle(node),)
    faults: list[Fault] = []
    items = node.sequence(faults, least=count, most=count)
    raise_if_any(faults)
    return tuple(angle(item) for item in items or ())


RESERVED = frozenset({"all", "not"})
_READERS: dict[str, Callable[[Steps, Node], None]] = {
    "mcx": Steps.mcx,
    "mcz": Steps.mcz,
    "mcp": Steps.mcp,
    "and": Steps.product,
    "measure": Steps.measure,
    "reset": Steps.reset,
    "barrier": Steps.barrier,
    "repeat": Steps.repeat,
    "scope": Steps.scope,
}
