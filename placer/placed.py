"""The placed circuit: fine operations of all steps in placed order, as flat arrays.

In: a problem and the choices made for it (sites, recipes, leases, order of steps).
Out: arrays that the trial route and the timeline run over.  A token is what started
on a site and bears that site's number; a holder is the wire or the lease that an
operation acts for.  No sites change here, nothing is timed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from placer.errors import InternalError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.problem import Problem
    from placer.recipes.circuit import Built, Op

Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

ONE, TEE, MEASURE, RESET, BARRIER, TWO, LEVEL2 = range(7)
"""Classes of operations; from `TWO` on they need a link."""

_CODES = {
    "t": TEE,
    "tdg": TEE,
    "measure": MEASURE,
    "reset": RESET,
    "barrier": BARRIER,
    "cx": TWO,
    "cz": TWO,
    "level2": LEVEL2,
}
_KEPT_PROBLEMS = 4


class Flow(NamedTuple):
    """What depends on what: the part of a placed circuit that compiled loops read.

    Per operation: `code`, `first` (its entries are `first[i] .. first[i + 1]`),
    `waits` (how many operations must come before it: the last on each token, and the
    measurement of its condition), `heard_first` (its listeners, conditional
    operations, are `heard[heard_first[i]:heard_first[i + 1]]`), `gate` (its number
    among two-body gates or -1).  Per entry, one token of one operation: `token`,
    `owner` (its operation), `following` (the next entry on the token or -1),
    `enters`, `leaves` (level 2), `needs` (level 2 under the gate).
    """

    code: Ints
    first: Ints
    waits: Ints
    cause: Ints
    heard_first: Ints
    heard: Ints
    gate: Ints
    token: Ints
    owner: Ints
    following: Ints
    enters: Flags
    leaves: Flags
    needs: Flags


@dataclass(frozen=True, slots=True, eq=False)
class PlacedCircuit:
    """All fine operations in placed order.

    `step` is the step of each operation, `holder` the holder of each entry: wires
    have their own numbers, leases without a lender follow, `leases[k]` being the
    (step, slot) of holder `wires + k`.  `gates[g]` is the operation of two-body gate
    g.  `alive_after[e]` says whether the holder is charged between entry e and what
    comes next on its token, `alive_before[p]` whether token p is charged before its
    first operation, `valued_after[e]` whether a value lives there.  `is_value` and
    `home` are per holder; `fresh` lists the home sites that are prepared in |0>,
    `held` the sites of wires that start unknown.
    """

    flow: Flow
    sites: int
    steps: int
    wires: int
    step: Ints
    holder: Ints
    gates: Ints
    leases: tuple[tuple[int, int], ...]
    is_value: Flags
    home: Ints
    alive_after: Flags
    valued_after: Flags
    alive_before: Flags
    fresh: Ints
    held: Ints

    @property
    def operations(self) -> int:
        """Number of fine operations."""
        return len(self.flow.code)

    @property
    def holders(self) -> int:
        """Number of wires and of leases without a lender."""
        return self.wires + len(self.leases)


class _Template(NamedTuple):
    """A fine circuit as arrays, on local wires."""

    code: Ints
    width: Ints
    cause: Ints
    local: Ints
    enters: Flags
    leaves: Flags
    needs: Flags


class _Templates:
    """Templates of the recipes of one problem, made when first asked for."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        self._known: dict[int, tuple[Built, _Template]] = {}

    def of(self, built: Built) -> _Template:
        """Return the template of a recipe."""
        # The recipe is kept beside its template, so its id cannot be used again.
        known = self._known.get(id(built))
        if known is None:
            known = self._known[id(built)] = (built, _make_template(built))
        return known[1]


_cache: list[_Templates] = []


def _templates(problem: Problem) -> _Templates:
    for known in _cache:
        if known.problem is problem:
            return known
    _cache.append(_Templates(problem))
    del _cache[:-_KEPT_PROBLEMS]
    return _cache[-1]


def _code(op: Op) -> int:
    code = _CODES.get(op.name, ONE)
    count = len(op.wires)
    if code != BARRIER and count != (2 if code >= TWO else 1):
        raise InternalError(f"'{op.name}' on {count} wires is no fine operation")
    return code


def _make_template(built: Built) -> _Template:
    code, width, cause, local = [], [], [], []
    enters, leaves, needs = [], [], []
    high = set(built.level2_wires)
    written: dict[int, int] = {}
    for number, op in enumerate(built.fine.ops):
        code.append(_code(op))
        width.append(len(op.wires))
        if op.condition is not None and op.condition not in written:
            raise InternalError(f"{built.recipe}: condition before its measurement")
        cause.append(-1 if op.condition is None else written[op.condition])
        if op.bit is not None:
            written[op.bit] = number
        for wire in op.wires:
            local.append(wire)
            enters.append(wire in op.enters)
            leaves.append(wire in op.leaves)
            needs.append(op.name == "level2" and wire in high)
    return _Template(
        code=np.array(code, dtype=np.int64),
        width=np.array(width, dtype=np.int64),
        cause=np.array(cause, dtype=np.int64),
        local=np.array(local, dtype=np.int64),
        enters=np.array(enters, dtype=np.bool_),
        leaves=np.array(leaves, dtype=np.bool_),
        needs=np.array(needs, dtype=np.bool_),
    )


def place(
    problem: Problem,
    sites: Sequence[int],
    recipes: Sequence[Built],
    slot_sites: Sequence[Sequence[int]],
    order: Sequence[int],
    lenders: Sequence[Sequence[int | None]],
) -> PlacedCircuit:
    """Return the placed circuit of a complete set of choices.

    Parameters
    ----------
    problem
        The program and the device.
    sites
        First site of each wire; that of a wire without operations that starts in |0>
        is not read.
    recipes, slot_sites, lenders
        Per step of the program: its recipe, the site and the lender of each slot
        (a wire; `None` or a negative number for none).
    order
        The steps in placed order.
    """
    known = _templates(problem)
    parts = [known.of(recipes[s]) for s in order]
    wires = len(problem.program.wire_names)
    site_map: list[int] = []
    holder_map: list[int] = []
    leases: list[tuple[int, int]] = []
    fresh: list[int] = []
    maps = [0]
    for s in order:
        operands = problem.program.operations[s].wires
        site_map.extend(sites[w] for w in operands)
        holder_map.extend(operands)
        for slot, site in enumerate(slot_sites[s]):
            lender = lenders[s][slot]
            site_map.append(site)
            if lender is None or lender < 0:
                holder_map.append(wires + len(leases))
                leases.append((s, slot))
            else:
                holder_map.append(lender)
            if recipes[s].slots[slot] == "clean":
                fresh.append(site)
        maps.append(len(site_map))
    flat = _join(parts)
    sizes = np.array([len(t.code) for t in parts], dtype=np.int64)
    spans = np.array([len(t.local) for t in parts], dtype=np.int64)
    where = flat.local + np.repeat(np.array(maps[:-1], dtype=np.int64), spans)
    begins = np.cumsum(sizes) - sizes
    cause = np.where(flat.cause < 0, -1, flat.cause + np.repeat(begins, sizes))
    _listen(problem, recipes, order, begins, cause)
    flow = _flow(
        flat._replace(cause=cause, local=np.array(site_map, dtype=np.int64)[where]),
        len(problem.device.sites),
    )
    return _complete(
        problem,
        sites,
        flow,
        np.repeat(np.array(order, dtype=np.int64), sizes),
        np.array(holder_map, dtype=np.int64)[where],
        [slot_sites[s][k] for s, k in leases],
        leases,
        fresh,
    )


def two_body_circuit(one: Ints, two: Ints, sites: int) -> PlacedCircuit:
    """Return a circuit of nothing but gates between two tokens, for a trial route.

    It belongs to one step and knows no wires: it can be routed, not priced.
    """
    count = len(one)
    none = np.zeros(0, dtype=np.int64)
    no = np.zeros(2 * count, dtype=np.bool_)
    flat = _Template(
        code=np.full(count, TWO, dtype=np.int64),
        width=np.full(count, 2, dtype=np.int64),
        cause=np.full(count, -1, dtype=np.int64),
        local=np.stack([one, two], axis=1).ravel().astype(np.int64),
        enters=no,
        leaves=no,
        needs=no,
    )
    return PlacedCircuit(
        flow=_flow(flat, sites),
        sites=sites,
        steps=1,
        wires=0,
        step=np.zeros(count, dtype=np.int64),
        holder=none,
        gates=np.arange(count, dtype=np.int64),
        leases=(),
        is_value=no[:0],
        home=none,
        alive_after=no[:0],
        valued_after=no[:0],
        alive_before=no[:0],
        fresh=none,
        held=none,
    )


def _listen(
    problem: Problem,
    recipes: Sequence[Built],
    order: Sequence[int],
    begins: Ints,
    cause: Ints,
) -> None:
    """Let operations that wait for a bit of the program depend on its measurement.

    A bit that no step before has measured is 0 from the start: nothing to wait for.
    """
    written: dict[str, int] = {}
    for place, step in enumerate(order):
        begin = int(begins[place])
        for number, op in enumerate(recipes[step].fine.ops):
            if op.listens is None:
                break
            cause[begin + number] = written.get(op.listens, -1)
        bit = problem.program.operations[step].bit
        if bit is not None:
            written[bit] = begin


def _join(parts: Sequence[_Template]) -> _Template:
    if not parts:
        none = np.zeros(0, dtype=np.int64)
        no = np.zeros(0, dtype=np.bool_)
        return _Template(none, none, none, none, no, no, no)
    return _Template(*(np.concatenate(column) for column in zip(*parts, strict=True)))


def _flow(flat: _Template, sites: int) -> Flow:
    """Return the flow of operations whose local wires are already tokens."""
    count = len(flat.code)
    first = np.zeros(count + 1, dtype=np.int64)
    np.cumsum(flat.width, out=first[1:])
    owner = np.repeat(np.arange(count, dtype=np.int64), flat.width)
    following = np.full(len(owner), -1, dtype=np.int64)
    line = np.argsort(flat.local, kind="stable")
    same = flat.local[line[1:]] == flat.local[line[:-1]]
    following[line[:-1][same]] = line[1:][same]
    if np.any(owner[following[following >= 0]] == owner[following >= 0]):
        raise InternalError("an operation has two of its wires on one site")
    waits = np.bincount(owner[following[following >= 0]], minlength=count)
    waits += flat.cause >= 0
    listeners = np.flatnonzero(flat.cause >= 0)
    listeners = listeners[np.argsort(flat.cause[listeners], kind="stable")]
    heard_first = np.zeros(count + 1, dtype=np.int64)
    np.cumsum(np.bincount(flat.cause[listeners], minlength=count), out=heard_first[1:])
    needs_link = flat.code >= TWO
    if len(flat.local) and int(flat.local.max()) >= sites:
        raise InternalError("a site that the device does not have")
    return Flow(
        code=flat.code,
        first=first,
        waits=waits.astype(np.int64),
        cause=flat.cause,
        heard_first=heard_first,
        heard=listeners.astype(np.int64),
        gate=np.where(needs_link, np.cumsum(needs_link) - 1, -1),
        token=flat.local,
        owner=owner,
        following=following,
        enters=flat.enters,
        leaves=flat.leaves,
        needs=flat.needs,
    )


def _complete(
    problem: Problem,
    sites: Sequence[int],
    flow: Flow,
    step: Ints,
    holder: Ints,
    lease_sites: Sequence[int],
    leases: Sequence[tuple[int, int]],
    fresh: Sequence[int],
) -> PlacedCircuit:
    program = problem.program
    registers = [program.register_at(w) for w in range(len(program.wire_names))]
    wires = len(registers)
    used = np.zeros(wires, dtype=np.bool_)
    for op in program.operations:
        used[list(op.wires)] = True
    unknown = np.array([r.start == "unknown" for r in registers], dtype=np.bool_)
    scratch = np.array([r.workspace for r in registers], dtype=np.bool_)
    no_more = np.ones(len(leases), dtype=np.bool_)
    ends = np.concatenate([scratch, no_more])
    home = np.array([*sites[:wires], *lease_sites], dtype=np.int64)
    zero = np.flatnonzero(used & ~unknown)
    held = np.flatnonzero(unknown & (used | ~scratch))
    alive, valued = _lives(flow, holder, wires, ends)
    alive_before = np.zeros(len(problem.device.sites), dtype=np.bool_)
    alive_before[home[held]] = True
    return PlacedCircuit(
        flow=flow,
        sites=len(problem.device.sites),
        steps=len(program.operations),
        wires=wires,
        step=step,
        holder=holder,
        gates=np.flatnonzero(flow.gate >= 0).astype(np.int64),
        leases=tuple(leases),
        is_value=ends,
        home=home,
        alive_after=alive,
        valued_after=valued,
        alive_before=alive_before,
        fresh=np.array([*fresh, *home[zero]], dtype=np.int64),
        held=home[held],
    )


def _lives(flow: Flow, holder: Ints, wires: int, ends: Flags) -> tuple[Flags, Flags]:
    """Return after which entries a holder is charged, and after which a value lives.

    A wire rests between a reset and its next operation; after its last operation it
    is charged on only if it is no workspace and was neither measured nor reset.
    """
    code = flow.code[flow.owner]
    goes_on = flow.following >= 0
    goes_on &= holder[flow.following] == holder
    was_reset = code == RESET
    is_wire = holder < wires
    kept = ~(ends[holder] | was_reset | (code == MEASURE))
    alive = np.where(goes_on, ~(was_reset & is_wire), kept)
    return alive, goes_on & ~was_reset & ends[holder]
