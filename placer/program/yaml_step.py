"""Where the reading of program YAML stands, and its plain gates.

Every other step has a function in `yaml_call`, `yaml_readout` or `yaml_block`, which
gets the `Steps` and the details of the step.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace

from placer.errors import Fault, InputError, Place, did_you_mean
from placer.program.draft import Draft, Part, Step
from placer.program.model import PLAIN_GATES, OperationKind
from placer.program.signature import Signature
from placer.program.yaml_operand import Operand, angle, operands
from placer.yamlnode import Node, raise_if_any

MOST_STEPS = 1_000_000
MOST_FAULTS = 200
WIDEST = 100_000


class TooMany(InputError):  # noqa: N818 - a fault that ends the pass
    """The program becomes too large to go on reading."""


@dataclass(frozen=True, slots=True)
class Routine:
    """A routine: argument widths in order, scratch, steps, and what it computes.

    `borrowed` scratch may hold anything and comes back as it was: that is verified.
    A call gives it fresh workspace in |0>, which always serves.
    """

    name: str
    arguments: Mapping[str, int]
    scratch: Node | None
    borrowed: Node | None
    steps: Node
    computes: Step | None
    place: Place


@dataclass(slots=True)
class Routines:
    """All routines by name; calls of those that have faults are not told again."""

    known: dict[str, Routine] = field(default_factory=dict)
    failed: set[str] = field(default_factory=set)


@dataclass(slots=True)
class Steps:
    """Where the reading of steps stands.

    `names` are the registers in sight, `open` the scopes and parts around the step,
    `out` the list that steps are added to, `readers` what reads a step by its key.
    `owners` gives the scope of each workspace wire (-1: the file), `workspace_of` the
    registers of each scope; `routines` what `yaml_routine` knows.
    """

    draft: Draft
    names: dict[str, tuple[int, ...]]
    bits: dict[str, tuple[str, ...]]
    faults: list[Fault]
    readers: Mapping[str, Callable[[Steps, Node], None]]
    open: list[tuple[int, Part]] = field(default_factory=list)
    out: list[Step] = field(default_factory=list)
    owners: dict[int, int] = field(default_factory=dict)
    workspace_of: dict[int, list[int]] = field(default_factory=dict)
    count: int = 0
    routines: Routines = field(default_factory=Routines)

    def read(self, node: Node) -> None:
        """Read a list of steps."""
        for item in node.sequence(self.faults) or ():
            self.count_turn(item.place)
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
        reader = self.readers.get(key.value)
        if reader is not None:
            reader(self, value)
        elif key.value in PLAIN_GATES:
            self._gate(key.value, value, key.place)
        else:
            known = sorted([*self.readers, *PLAIN_GATES])
            help = did_you_mean(key.value, known)
            if key.value in ("ccx", "ccz"):
                help = f"write 'mc{key.value[-1]}' with controls and target"
            key.fault(self.faults, "unknown-step", f"unknown step {key.shown}", help)

    def count_turn(self, place: Place, added: int = 1) -> None:
        """Count steps, and end the pass where there are too many."""
        self.count += added
        if self.count > MOST_STEPS:
            what = f"the program expands to more than {MOST_STEPS} steps"
            raise TooMany([Fault(place, "too-large", what)])

    def add(
        self,
        kind: OperationKind,
        wires: Sequence[int],
        place: Place,
        *,
        name: str = "",
        params: tuple[float, ...] = (),
        bit: str | None = None,
        is_frame: bool = False,
        signature: Signature | None = None,
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
        self.count_turn(place)
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
                signature=signature,
            )
        )

    def plain(self, node: Node) -> list[Operand]:
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
        found = self.plain(on)
        if width == 1:
            for operand in found:
                for wire in operand.wires:
                    self.add("gate", (wire,), place, name=name, params=params)
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
            self.add("gate", wires, place, name=name, params=params)


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
