"""The claims a program makes about its workspace, verified by replaying it.

The flat program runs on many basis inputs at once, 64 to a machine word.  A gate that
branches (h, sx, rx, ...) sends its target along a random branch; phases do nothing.  If
a wire ends in 0 along every path, its amplitude of 1 is zero, whatever interferes.
All inputs are tried where there are few, else a fixed random sample: a claim that
survives is likely, not proven.  What a plan relies on is checked again by the check.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from placer.errors import Fault, InputError
from placer.program.model import Operation, Program
from placer.program.signature import (
    Signature,
    apply,
    changed,
    digits,
    numbers,
    promised,
    value_widths,
)

Words = NDArray[np.uint64]

MOST_FAULTS = 50
SAMPLES = 4096
MOST_FREE = 12  # wires whose inputs are all tried: 2^12 = SAMPLES
_WORDS = SAMPLES // 64
_SEED = 20210
_SMALL = 1e-9  # radians; what is left of a branch has a weight below 1e-18

DIAGONAL = frozenset(
    [
        "id",
        "z",
        "s",
        "sdg",
        "t",
        "tdg",
        "rz",
        "p",
        "cz",
        "cp",
        "crz",
        "rzz",
        "mcz",
        "mcp",
        "barrier",
        "measure",
    ]
)
BRANCHING = frozenset(["h", "sx", "sxdg", "rx", "ry", "u", "ch", "crx", "cry", "rxx"])


def check_claims(program: Program) -> None:
    """Refuse a program whose workspace does not end in |0>.

    Also refuses an `and` whose target is not 0, or is not taken back to 0, and
    arithmetic whose promises are broken.

    Raises
    ------
    InputError
        With the wire, the line of the claim, and an input that breaks it.
    """
    claimed = [
        wire
        for register in program.registers
        if register.workspace
        for wire in range(register.first, register.first + register.width)
    ]
    has_promises = any(op.kind in ("and", "sum", "lookup") for op in program.operations)
    if not claimed and not has_promises:
        return
    replay = Replay(program, frozenset(claimed))
    for operation in program.operations:
        replay.run(operation)
    for wire in claimed:
        if len(replay.faults) >= MOST_FAULTS:
            break
        replay.end(wire)
    if replay.faults:
        raise InputError(replay.faults)


@dataclass(slots=True)
class Replay:
    """The bits of all wires over all samples, and what was found wrong."""

    program: Program
    claimed: frozenset[int]
    faults: list[Fault] = field(default_factory=list)
    inputs: dict[int, Words] = field(default_factory=dict)
    bits: list[Words] = field(default_factory=list)
    refused: set[int] = field(default_factory=set)
    branched: Operation | None = None
    random: np.random.Generator = field(
        default_factory=lambda: np.random.default_rng(_SEED)
    )

    def __post_init__(self) -> None:
        """Give every wire that starts unknown its inputs."""
        used = sorted({wire for op in self.program.operations for wire in op.wires})
        free = [
            wire for wire in used if self.program.register_at(wire).start == "unknown"
        ]
        few = len(free) <= MOST_FREE
        columns = _all_inputs(len(free)) if few else self._some_inputs(len(free))
        zero = np.zeros(_WORDS, dtype=np.uint64)
        self.bits = [zero for _ in self.program.wire_names]
        for number, wire in enumerate(free):
            self.inputs[wire] = columns[number]
            self.bits[wire] = columns[number]

    def _some_inputs(self, count: int) -> list[Words]:
        """Return random columns; half of the words hold mostly ones or mostly zeros.

        A gate with many controls acts on so few inputs that even ones and zeros would
        hardly ever hit one.
        """
        words = np.arange(_WORDS)
        depth = np.where(words < _WORDS // 2, 0, 1 + words // 2 % 6)
        columns = []
        for _ in range(count):
            layers = self.random.integers(0, 2**64, size=(7, _WORDS), dtype=np.uint64)
            ones = np.bitwise_or.accumulate(layers)[depth, words]
            zeros = np.bitwise_and.accumulate(layers)[depth, words]
            columns.append(np.where(words % 2, ones, zeros))
        return columns

    def _any(self) -> Words:
        return self.random.integers(0, 2**64, size=_WORDS, dtype=np.uint64)

    def run(self, operation: Operation) -> None:
        """Move the samples through one operation."""
        name = operation.name if operation.kind == "gate" else operation.kind
        if name in DIAGONAL:
            return
        wires, bits = operation.wires, self.bits
        if name in BRANCHING:
            self._branch(name, operation)
        elif name == "reset":
            self._reset(operation)
        elif name == "swap":
            first, second = wires
            bits[first], bits[second] = bits[second], bits[first]
        elif name == "and":
            self._product(operation)
        elif operation.signature is not None:
            self._arithmetic(operation, operation.signature)
        else:
            target = wires[-1]
            bits[target] = bits[target] ^ self._all_ones(wires[:-1])

    def _reset(self, operation: Operation) -> None:
        """Take a wire to 0; workspace must be there already, else it is measured."""
        wire = operation.wires[0]
        held = self.bits[wire]
        is_new = wire not in self.refused and len(self.faults) < MOST_FAULTS
        if wire in self.claimed and is_new and held.any():
            self.refused.add(wire)
            name = self.program.wire_names[wire]
            writer = self._writer(operation.index, wire)
            line = 0 if writer is None else writer.place.line
            self.faults.append(
                Fault(
                    operation.place,
                    "reset-entangled",
                    f"the workspace wire {name} is reset while it may hold what line "
                    f"{line} has written{self._example(held)}: that "
                    "measures it, and disturbs what it was computed from",
                    "undo what the workspace holds before the reset, or drop the claim",
                )
            )
        self.bits[wire] = np.zeros(_WORDS, dtype=np.uint64)

    def _writer(self, index: int, wire: int) -> Operation | None:
        """Return the last operation before another whose target is a wire."""
        earlier = self.program.operations[:index]
        return next((op for op in reversed(earlier) if wire in _targets(op)), None)

    def _all_ones(self, wires: Sequence[int]) -> Words:
        """Return where all wires are 1."""
        result = np.full(_WORDS, ~np.uint64(0))
        for wire in wires:
            result = result & self.bits[wire]
        return result

    def _branch(self, name: str, operation: Operation) -> None:
        wires, bits = operation.wires, self.bits
        kind = _turn(operation.params)
        if kind == "diagonal":
            return
        controls: tuple[int, ...] = wires[:-1] if name != "rxx" else ()
        chosen = self._all_ones(controls)
        if kind == "branch":
            self._refuse_branching(operation)
            self.branched = self.branched or operation
            chosen = chosen & self._any()
        for target in wires[len(controls) :]:
            bits[target] = bits[target] ^ chosen

    def _refuse_branching(self, operation: Operation) -> None:
        """Refuse the claim for a wire that a branching gate acts on."""
        targets = operation.wires if operation.name == "rxx" else operation.wires[-1:]
        for wire in targets:
            if wire in self.claimed and wire not in self.refused:
                self.refused.add(wire)
                register = self.program.register_at(wire)
                name = self.program.wire_names[wire]
                self.faults.append(
                    Fault(
                        register.place,
                        "workspace-claim",
                        f"the workspace wire {name} is the target of "
                        f"'{operation.name}' in line {operation.place.line}, so that "
                        "it cannot be verified that it ends in |0>",
                        "use only x, cx, swap, mcx and phases on workspace, or drop "
                        "the claim",
                    )
                )

    def _product(self, operation: Operation) -> None:
        """Compute a product into a wire that must be 0, or take it away."""
        target = operation.wires[-1]
        product = self._all_ones(operation.wires[:-1])
        before = self.bits[target]
        after = before ^ product
        wrong = after if operation.inverse else before
        is_new = target not in self.refused and len(self.faults) < MOST_FAULTS
        if is_new and wrong.any():
            self.refused.add(target)
            name = self.program.wire_names[target]
            what = (
                f"'and' finds {name} in 1, it must be in |0>"
                if not operation.inverse
                else f"taking back 'and' leaves {name} in 1"
            )
            writer = self._writer(operation.index, target)
            if writer is not None and writer.place.line:
                what += f", as line {writer.place.line} has left it"
            self.faults.append(
                Fault(
                    operation.place,
                    "and-target",
                    f"{what}{self._example(wrong)}",
                    "compute the product into workspace that is in |0>",
                )
            )
        self.bits[target] = np.zeros_like(before) if operation.inverse else product

    def _arithmetic(self, operation: Operation, signature: Signature) -> None:
        """Do arithmetic on the numbers of all samples; refuse a broken promise."""
        wires = operation.wires
        columns = [
            np.unpackbits(self.bits[w].view(np.uint8), bitorder="little") for w in wires
        ]
        widths = value_widths(signature)
        results = [np.zeros_like(column) for column in columns]
        broken = np.zeros(SAMPLES, dtype=np.uint8)
        for sample in range(SAMPLES):
            values = numbers([int(column[sample]) for column in columns], widths)
            if not promised(signature, values):
                broken[sample] = 1
                continue
            for place, bit in enumerate(digits(apply(signature, values), widths)):
                results[place][sample] = bit
        if broken.any() and len(self.faults) < MOST_FAULTS:
            wrong = np.packbits(broken, bitorder="little").view(np.uint64)
            what = {
                "sum": "the register for the sum is not in |0>",
                "lookup": "the address lies beyond the table",
            }.get(operation.kind, "a promise is broken")
            self.faults.append(
                Fault(
                    operation.place,
                    "broken-promise",
                    f"'{operation.kind}': {what}{self._example(wrong)}",
                    "give it what its kind expects",
                )
            )
        for wire, result in zip(wires, results, strict=True):
            self.bits[wire] = np.packbits(result, bitorder="little").view(np.uint64)

    def end(self, wire: int) -> None:
        """Report a claimed wire that does not end in 0."""
        wrong = self.bits[wire]
        if wire in self.refused or not wrong.any():
            return
        register = self.program.register_at(wire)
        name = self.program.wire_names[wire]
        place = register.place
        self.faults.append(
            Fault(
                place,
                "workspace-claim",
                f"the workspace declared in line {place.line} must end in |0>, but"
                f"{self._example(wrong, lead='')} the wire {name} ends in 1",
                "undo what the workspace holds, or drop the claim",
            )
        )

    def _example(self, wrong: Words, lead: str = ",") -> str:
        """Say an input with the fewest ones among those that go wrong."""
        samples = np.flatnonzero(np.unpackbits(wrong.view(np.uint8), bitorder="little"))
        ones = np.zeros(SAMPLES, dtype=np.int64)
        columns = {
            wire: np.unpackbits(column.view(np.uint8), bitorder="little")
            for wire, column in self.inputs.items()
        }
        for column in columns.values():
            ones += column
        sample = int(samples[np.argmin(ones[samples])])
        parts = []
        for register in self.program.registers:
            value = sum(
                int(columns[wire][sample]) << (wire - register.first)
                for wire in range(register.first, register.first + register.width)
                if wire in columns
            )
            if any(
                wire in columns
                for wire in range(register.first, register.first + register.width)
            ):
                digits = f"0b{value:0{register.width}b}"
                parts.append(f"{register.name} = {digits}")
        text = f"{lead} with {', '.join(parts)}" if parts else lead
        if self.branched is not None:
            text += (
                f"{' and' if parts else ''} along one branch of "
                f"'{self.branched.name}' in line {self.branched.place.line}"
            )
        return text


def _targets(operation: Operation) -> tuple[int, ...]:
    if operation.signature is not None:
        return tuple(operation.wires[w] for w in changed(operation.signature))
    return operation.wires if operation.name == "swap" else operation.wires[-1:]


def _all_inputs(count: int) -> list[Words]:
    """Return columns whose samples run through all inputs, as often as they fit."""
    samples = np.arange(SAMPLES, dtype=np.uint64)
    columns = []
    for number in range(count):
        bits = ((samples >> np.uint64(number)) & np.uint64(1)).astype(np.uint8)
        columns.append(np.packbits(bits, bitorder="little").view(np.uint64))
    return columns


def _turn(params: tuple[float, ...]) -> str:
    """Say whether a gate with an angle branches, flips, or only changes phases."""
    if not params:
        return "branch"
    rest = math.remainder(params[0], 2 * math.pi)
    if abs(rest) < _SMALL:
        return "diagonal"
    if abs(abs(rest) - math.pi) < _SMALL:
        return "flip"
    return "branch"
