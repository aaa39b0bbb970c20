"""Which operations make which value, before equal values are seen to be one.

In: a program.  Out: makings (the operations that write the same workspace wires in the
compute part of one scope) and the operations that are there for good.  A scope that
cannot be taken apart is looked through, and the search starts again without it.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.program.roles import Part, is_bitwise, name_of, part_of, written

if TYPE_CHECKING:
    from placer.program.model import Operation, Program


@dataclass(slots=True)
class Making:
    """The making of one value.

    `scope` is the outermost scope whose compute part makes it, `home` the innermost,
    whose cleanup takes it back first.  `steps` are its operations, `wires` the
    workspace wires it writes, in the order in which they are first touched,
    `inputs` other makings it reads, `outside` the other wires it reads.  `first` counts
    the kept operations before it.
    """

    scope: int
    home: int
    first: int
    steps: list[int] = field(default_factory=list)
    wires: list[int] = field(default_factory=list)
    inputs: set[int] = field(default_factory=set)
    outside: set[int] = field(default_factory=set)


@dataclass(slots=True)
class Makings:
    """All makings, in the order of their first steps.

    `kept` are the operations that are there for good.  `owners[step]` says for each
    workspace wire that a step touches which making it belongs to there.
    """

    makings: list[Making]
    kept: list[int]
    owners: dict[int, dict[int, int]]


def makings(program: Program) -> Makings:
    """Return the makings of a program."""
    fixed: frozenset[int] = frozenset()
    while True:
        search = _Search(program, fixed)
        bad = search.run()
        if bad is None:
            return search.result()
        fixed |= {bad}


class _Fixed(Exception):  # noqa: N818 - a turn of the search, no error
    """A scope that cannot be taken apart."""

    def __init__(self, scope: int) -> None:
        super().__init__(scope)
        self.scope = scope


class _Search:
    """One pass over the program with some scopes looked through.

    `owner` is the making that a workspace wire belongs to at this point, `block` the
    steps of an unfinished pair of frames, `turned` the wires they have left turned.
    """

    def __init__(self, program: Program, fixed: frozenset[int]) -> None:
        self.program = program
        self.fixed = fixed
        self.found: list[Making] = []
        self.merged: list[int] = []
        self.readers: list[set[int]] = []
        self.owner: dict[int, int] = {}
        self.owners: dict[int, dict[int, int]] = {}
        self.kept: list[int] = []
        self.block: list[Operation] = []
        self.turned: set[int] = set()
        self.scope = -1
        # Workspace that something else may have left in another state than |0>.
        self.dirty: set[int] = set()
        self.ends: dict[int, list[int]] = {}
        for scope in program.scopes:
            end = max(scope.cleanup[1], scope.body[1])
            self.ends.setdefault(end, []).append(scope.number)
        self.scratch = [
            program.register_at(w).workspace for w in range(len(program.wire_names))
        ]

    def run(self) -> int | None:
        """Go through all operations; return a scope that has to be fixed, if any."""
        try:
            for operation in self.program.operations:
                self._leave(operation.index)
                part = part_of(self.program, operation, self.fixed)
                if self.block and (part.role != "make" or part.scope != self.scope):
                    raise _Fixed(self.scope)
                if part.role == "make":
                    self._make(operation, part)
                elif part.role == "use":
                    self._use(operation)
            if self.block:
                raise _Fixed(self.scope)
        except _Fixed as found:
            return found.scope
        return None

    def _leave(self, index: int) -> None:
        """Let go of the values of scopes whose cleanup is over."""
        over = self.ends.get(index)
        if over is not None:
            for wire, number in list(self.owner.items()):
                if self.found[self._root(number)].home in over:
                    del self.owner[wire]

    def _make(self, operation: Operation, part: Part) -> None:
        if not is_bitwise(operation):
            raise _Fixed(part.scope)
        self.scope = part.scope
        self.block.append(operation)
        for wire in written(operation):
            if self.scratch[wire]:
                continue
            if name_of(operation) != "x":
                raise _Fixed(part.scope)
            self.turned ^= {wire}
        if not self.turned:
            self._close(part.scope, part.home)

    def _close(self, scope: int, home: int) -> None:
        """Give the finished block to the making whose wires it writes."""
        own = self._own()
        if not own or not self.dirty.isdisjoint(own):
            raise _Fixed(scope)
        touched = {self._root(self.owner[w]) for w in own if w in self.owner}
        if any(self.found[n].scope != scope for n in touched):
            raise _Fixed(scope)
        number = min(touched, default=-1)
        if number < 0:
            number = len(self.found)
            self.found.append(Making(scope, home, len(self.kept)))
            self.merged.append(number)
            self.readers.append(set())
        for other in sorted(touched - {number}):
            self._merge(number, other)
        for wire in own:
            self.owner[wire] = number
        self._extend(number)
        # What was read before it was finished belongs together with its reader.
        for reader in sorted(self.readers[number]):
            self._merge(number, reader)
        self.readers[number].clear()
        self.block = []

    def _own(self) -> list[int]:
        """Return the workspace wires that a block writes, or else touches."""
        wrote = [w for op in self.block for w in written(op) if self.scratch[w]]
        if not wrote:
            wrote = [w for op in self.block for w in op.wires if w in self.owner]
        return list(dict.fromkeys(wrote))

    def _extend(self, number: int) -> None:
        making = self.found[number]
        for operation in self.block:
            making.steps.append(operation.index)
            held = self.owners.setdefault(operation.index, {})
            for wire in operation.wires:
                if wire not in self.owner:
                    making.outside.add(wire)
                    continue
                owner = self._root(self.owner[wire])
                held[wire] = owner
                if owner == number and wire not in making.wires:
                    making.wires.append(wire)
                elif owner != number:
                    making.inputs.add(owner)
                    self.readers[owner].add(number)

    def _root(self, number: int) -> int:
        while self.merged[number] != number:
            number = self.merged[number]
        return number

    def _merge(self, one: int, two: int) -> None:
        """Make one making of two; the earlier number stays."""
        one, two = sorted((self._root(one), self._root(two)))
        if one == two:
            return
        self.merged[two] = one
        into, other = self.found[one], self.found[two]
        if into.home != other.home:
            into.home = into.scope
        into.steps = sorted({*into.steps, *other.steps})
        into.wires += [w for w in other.wires if w not in into.wires]
        into.inputs |= other.inputs
        into.outside |= other.outside
        self.readers[one] |= self.readers[two]

    def _use(self, operation: Operation) -> None:
        held: dict[int, int] = {
            w: self._root(self.owner[w]) for w in operation.wires if w in self.owner
        }
        spoiled = [held[w] for w in written(operation) if w in held]
        if spoiled:
            raise _Fixed(self.found[spoiled[0]].scope)
        for wire in written(operation):
            if operation.kind == "reset":
                self.dirty.discard(wire)
            elif self.scratch[wire]:
                self.dirty.add(wire)
        self.owners[operation.index] = held
        self.kept.append(operation.index)

    def result(self) -> Makings:
        """Return what was found, with merged makings as one."""
        roots = [n for n in range(len(self.found)) if self.merged[n] == n]
        number = {root: k for k, root in enumerate(roots)}
        rows = []
        for root in roots:
            making = self.found[root]
            inputs = {number[self._root(n)] for n in making.inputs}
            making.inputs = inputs - {number[root]}
            rows.append(making)
        owners = {
            step: {wire: number[self._root(n)] for wire, n in held.items()}
            for step, held in self.owners.items()
        }
        return Makings(rows, self.kept, owners)
