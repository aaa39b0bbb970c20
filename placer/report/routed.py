"""Write a plan as routed OpenQASM 3: the included route with its swaps in the text.

In: a plan, its program, its device.  Out: one text at the Clifford+T level in which
every two-qubit gate is on a link and every swap of the included route is one `swap`
statement.  The route is followed here anew, from the plan's own words alone.
"""

from __future__ import annotations

import heapq
import json
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from placer.errors import InputError, Place
from placer.plan import Plan, to_json
from placer.report.qasm import (
    Writer,
    add_title,
    annotation,
    condition_of,
    framed,
    open_writer,
    placed_steps,
    statement_of,
)

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.device.model import Device
    from placer.program.model import Program
    from placer.recipes.circuit import Op
    from placer.report.qasm import PlacedStep

LINKED = frozenset({"cx", "cz", "level2"})


@dataclass(slots=True)
class _Item:
    """One fine operation: its step, its tokens, what waits for it, what it waits for.

    A token is what started on a site and bears that site's number.
    """

    step: PlacedStep
    op: Op
    tokens: tuple[int, ...]
    base: int
    waits: int = 0
    then: list[int] = field(default_factory=list)


def routed_qasm(
    plan: Plan | Mapping[str, Any], program: Program, device: Device
) -> str:
    """Return a plan as OpenQASM 3 on physical qubits, its own route spelled out.

    `plan` may be the raw data of a plan file, which should have been checked.

    Raises
    ------
    InputError
        If the plan uses level 2, which the standard has no gates for, or if its route
        does not bring a gate to a link.
    """
    data: Mapping[str, Any] = (
        json.loads(to_json(plan)) if isinstance(plan, Plan) else plan
    )
    steps = placed_steps(data, program)
    _need_two_levels(steps)
    writer = open_writer(program)
    items = _items(writer, steps, data["wires"], program)
    swaps = [(int(a), int(b)) for a, b in data["route"]["swaps"]]
    follower = _Follower(writer, items, program, device, len(steps))
    follower.run(data["route"]["gaps"], swaps)
    head = [
        f"placed and routed by placer {data['version']}; Clifford+T level",
        f"program: {program.name}  device: {device.name}",
        f"calibrated: {device.calibrated or 'not dated'}",
        f"start states: {program.assumed}",
        f"{len(swaps)} swaps of the included route; every two-qubit gate is on a link",
        "The plan's figures are estimates from that calibration, not promises.",
    ]
    ends = " ".join(
        f"{name}=${follower.place[data['wires'][name]]}"
        for name in program.wire_names
        if name in data["wires"]
    )
    pragmas = [f"pragma placer.swaps {len(swaps)}"]
    if ends:
        pragmas.append(f"pragma placer.final {ends}")
    return framed(writer, steps, data["wires"], program, head, pragmas)


def _need_two_levels(steps: Sequence[PlacedStep]) -> None:
    for step in steps:
        if step.built.level2_wires:
            raise InputError.at(
                step.operation.place,
                "level2-not-routed",
                f"'{step.operation.name}' is placed on level 2 (recipe "
                f"{step.built.recipe}): OpenQASM has no gates that a routed file could "
                "spell it with",
                "write it with --qasm, or leave level 2 out with --only",
            )


def _items(
    writer: Writer,
    steps: Sequence[PlacedStep],
    sites: Mapping[str, int],
    program: Program,
) -> list[_Item]:
    """Return the fine operations in placed order with what depends on what."""
    items: list[_Item] = []
    last_on: dict[int, int] = {}
    measured: dict[str, int] = {}
    for step in steps:
        op = step.operation
        here = [sites[program.wire_names[w]] for w in op.wires]
        here += [lease.site for lease in step.leases]
        base = writer.cleanup_bits
        if op.kind != "measure":
            writer.cleanup_bits += step.built.fine.bits
        own: dict[int, int] = {}
        for fine in step.built.fine.ops:
            number = len(items)
            item = _Item(step, fine, tuple(here[w] for w in fine.wires), base)
            before = {last_on[t] for t in item.tokens if t in last_on}
            if fine.condition is not None:
                before.add(own[fine.condition])
            if fine.listens is not None and fine.listens in measured:
                before.add(measured[fine.listens])
            item.waits = len(before)
            for one in before:
                items[one].then.append(number)
            last_on.update(dict.fromkeys(item.tokens, number))
            if fine.bit is not None:
                own[fine.bit] = number
            items.append(item)
        if op.bit is not None:
            measured[op.bit] = len(items) - 1
    return items


class _Follower:
    """Where every token is while the route is written down."""

    def __init__(
        self,
        writer: Writer,
        items: list[_Item],
        program: Program,
        device: Device,
        steps: int,
    ) -> None:
        self.writer = writer
        self.items = items
        self.program = program
        self.device = device
        count = len(device.sites)
        self.place = list(range(count))
        self.token_at = list(range(count))
        self.gates = [n for n, item in enumerate(items) if item.op.name in LINKED]
        self.ready = [
            n
            for n, item in enumerate(items)
            if not item.waits and item.op.name not in LINKED
        ]
        heapq.heapify(self.ready)
        self.left = [0] * steps
        self.number_of = {id(item.step): 0 for item in items}
        for rank, key in enumerate(self.number_of):
            self.number_of[key] = rank
        for item in items:
            self.left[self.number_of[id(item.step)]] += 1
        self.begun: set[int] = set()
        self.done: set[int] = set()
        self.bits = _Bits(items)

    def run(
        self, gaps: Sequence[Sequence[Sequence[int]]], swaps: Sequence[tuple[int, int]]
    ) -> None:
        """Write everything down: the gates of a gap, then its swap."""
        self._settle()
        for number, runs in enumerate(gaps):
            for first, last in runs:
                for gate in range(first, last + 1):
                    self._gate(gate)
            if number < len(swaps):
                self._swap(*swaps[number])
        if len(self.done) < len(self.items):
            raise self._fault("the route leaves operations undone")
        self.bits.fill(self.writer)

    def _gate(self, gate: int) -> None:
        number = self.gates[gate]
        item = self.items[number]
        one, two = (self.place[t] for t in item.tokens)
        if item.waits:
            raise self._fault(f"two-body gate {gate} comes before what it waits for")
        if not self._is_link(one, two):
            raise self._fault(f"two-body gate {gate} is at ${one}, ${two}, no link")
        self._write(number)
        self._settle()

    def _swap(self, a: int, b: int) -> None:
        if not self._is_link(a, b):
            raise self._fault(f"a swap is at ${a}, ${b}, no link")
        self.writer.lines.append(f"swap ${a}, ${b};")
        one, two = self.token_at[a], self.token_at[b]
        self.token_at[a], self.token_at[b] = two, one
        self.place[one], self.place[two] = b, a

    def _is_link(self, a: int, b: int) -> bool:
        link = self.device.link(a, b)
        return link is not None and self.device.is_usable(link)

    def _settle(self) -> None:
        """Write all operations that need no link and wait for nothing any more."""
        while self.ready:
            self._write(heapq.heappop(self.ready))

    def _write(self, number: int) -> None:
        item = self.items[number]
        self.done.add(number)
        for later in item.then:
            following = self.items[later]
            following.waits -= 1
            if not following.waits and following.op.name not in LINKED:
                heapq.heappush(self.ready, later)
        self._notes(item)
        self.writer.lines.append(self._statement(item, number))

    def _notes(self, item: _Item) -> None:
        """Write the comment and the annotations that go before a step's statement."""
        rank = self.number_of[id(item.step)]
        op = item.step.operation
        lenders = [x.lender for x in item.step.leases if x.lender is not None]
        lines = self.writer.lines
        if rank not in self.begun:
            self.begun.add(rank)
            if op.is_call:
                add_title(self.writer, item.step)
            lines += [annotation(a) for a in op.annotations if "placer." not in a[:8]]
            lines += [f"@placer.borrow lender={name}" for name in lenders]
        self.left[rank] -= 1
        if not self.left[rank]:
            lines += [f"@placer.return lender={name}" for name in lenders]

    def _statement(self, item: _Item, number: int) -> str:
        here = [self.place[t] for t in item.tokens]
        op = item.step.operation
        if op.kind == "measure":
            target = "" if op.bit is None else f"{self.bits.mark(number, op.bit)} = "
            return f"{target}measure ${here[0]};"
        if item.op.name == "barrier":
            return f"barrier {', '.join(f'${site}' for site in here)};"
        local = [0] * (max(item.op.wires) + 1)
        for wire, site in zip(item.op.wires, here, strict=True):
            local[wire] = site
        text = statement_of(self.writer, item.op, local, item.base)
        wanted = condition_of(self.writer, item.op, item.base)
        if item.op.listens is not None:
            wanted = self.bits.mark(number, item.op.listens)
        return text if wanted is None else f"if ({wanted} == 1) {{ {text} }}"

    def _fault(self, what: str) -> InputError:
        return InputError.at(
            Place(self.program.path),
            "route-broken",
            what,
            "check the plan with 'placer check'",
        )


class _Bits:
    """Where the program's measurements are written, and who reads them.

    A route may do what concerns one bit in another order than the program.  Where it
    does, all measurements but the last one go to bits of their own.
    """

    def __init__(self, items: Sequence[_Item]) -> None:
        self.written: dict[int, str] = {}
        self.cause: dict[int, int | None] = {}
        self.users: dict[str, list[int]] = {}
        self.done: dict[str, list[int]] = {}
        self.last: dict[str, int] = {}
        for number, item in enumerate(items):
            op = item.step.operation
            bit = item.op.listens
            if bit is not None:
                self.cause[number] = self.last.get(bit)
                self.users.setdefault(bit, []).append(number)
            elif op.kind == "measure" and op.bit is not None:
                self.written[number] = op.bit
                self.last[op.bit] = number
                self.users.setdefault(op.bit, []).append(number)

    def mark(self, number: int, bit: str) -> str:
        """Note that an operation on a bit happens; return what stands for its name."""
        self.done.setdefault(bit, []).append(number)
        return f"\0{number}\0"

    def fill(self, writer: Writer) -> None:
        """Put the names of bits in place of what stands for them."""
        names: dict[int, str] = {}
        for bit, numbers in self.done.items():
            is_straight = _groups(numbers, self.written) == _groups(
                self.users[bit], self.written
            )
            for number in numbers:
                if number in self.written and number != self.last[bit]:
                    names[number] = writer.bit(bit)
                    if not is_straight:
                        names[number] = f"{writer.cleanup}[{writer.cleanup_bits}]"
                        writer.cleanup_bits += 1
                elif number in self.written:
                    names[number] = writer.bit(bit)
            for number in numbers:
                if number not in self.written:
                    cause = self.cause[number]
                    names[number] = writer.bit(bit) if cause is None else names[cause]
                    if cause is None and not is_straight:
                        # What it waits for was never measured: 0 for good.
                        names[number] = f"{writer.cleanup}[{writer.cleanup_bits}]"
                        writer.cleanup_bits += 1
        writer.lines = [_filled(line, names) for line in writer.lines]


def _groups(numbers: Sequence[int], written: Mapping[int, str]) -> list[set[int]]:
    """Return measurements, and between them sets of operations that wait for them."""
    groups: list[set[int]] = [set()]
    for number in numbers:
        if number in written:
            groups += [{number}, set()]
        else:
            groups[-1].add(number)
    return groups


def _filled(line: str, names: Mapping[int, str]) -> str:
    if "\0" not in line:
        return line
    parts = line.split("\0")
    parts[1::2] = [names[int(number)] for number in parts[1::2]]
    return "".join(parts)
