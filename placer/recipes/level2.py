"""Recipes on the third level of the call's own wires: chain, tree, mixed tree.

A control that is 1 and whose subtree is all ones steps up to |2>; the top of the tree
acts on the target; the mirror image brings everyone down.
Sources: Gokhale et al. 2019, arXiv 1905.10481 (tree); Ralph et al. 2007, arXiv
0806.0654, Kiktenko et al. 2020, arXiv 2001.06841, Nikolaeva et al. 2022, arXiv
2112.14535 (chain); node of four transpositions rebuilt independently.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

from placer.recipes.circuit import Level2Action, Op
from placer.recipes.draft import Draft, Job, Made


@dataclass(frozen=True, slots=True)
class Node:
    """A control and the subtrees whose product it joins."""

    wire: int
    children: tuple[Node, ...] = ()

    @property
    def active(self) -> int:
        """The level that says `all ones here`."""
        return 2 if self.children else 1


def lift(node: Node) -> list[Op]:
    """Return the gates that bring a node to |2> iff its whole subtree is ones.

    One child: |1> and |2> are swapped if the child is active.  Two children: the
    transpositions 01 (left) and 12 (right), done twice in turn, are a commutator that
    carries 0 -> 1 -> 2 -> 0 iff both are active and do nothing otherwise.
    """
    return [op for each in _from_below(node) for op in _join_children(each)]


def _from_below(top: Node) -> list[Node]:
    """Return all nodes, children before parents."""
    order, waiting = list[Node](), [top]
    while waiting:
        node = waiting.pop()
        order.append(node)
        waiting.extend(node.children)
    return order[::-1]


def _join_children(node: Node) -> list[Op]:
    wire = node.wire
    if len(node.children) == 1:
        return [_step(node.children[0], wire, "x12", enters=(wire,))]
    if not node.children:
        return []
    left, right = node.children
    return [
        _step(left, wire, "x01"),
        _step(right, wire, "x12", enters=(wire,)),
        _step(left, wire, "x01"),
        _step(right, wire, "x12"),
    ]


def _step(
    child: Node, wire: int, action: Level2Action, enters: tuple[int, ...] = ()
) -> Op:
    return Op(
        "level2", (child.wire, wire), level=child.active, action=action, enters=enters
    )


def inner_wires(top: Node) -> list[int]:
    """Return the wires that step up to |2>."""
    return [node.wire for node in _from_below(top) if node.children]


def _made(job: Job, top: Node) -> Made:
    up = Draft((), tuple(lift(top)))
    pair = (top.wire, job.target)
    if job.kind in ("mcx", "and"):
        act = Op("level2", pair, level=top.active, action="x01")
    else:
        angle = job.angle if job.kind == "mcp" else math.pi
        act = Op("level2", pair, (angle,), level=top.active, action="p1")
    fine = (*up.fine, act, *up.inverse().fine)
    wires = tuple(sorted(inner_wires(top)))
    return Made(Draft((), fine), as_one=True, level2_wires=wires)


def chain(job: Job) -> Made:
    """Return the chain: 2k-1 two-body gates."""
    node = Node(0)
    for wire in range(1, job.controls):
        node = Node(wire, (node,))
    return _made(job, node)


def tree(job: Job) -> Made:
    """Return the balanced tree: 4(k-1)+1 two-body gates for k = 2^d - 1."""
    return _made(job, _heap(0, job.controls))


def _heap(at: int, count: int) -> Node:
    """Return the subtree of a heap; the fuller child is needed last."""
    below = [child for child in (2 * at + 2, 2 * at + 1) if child < count]
    return Node(at, tuple(_heap(child, count) for child in below))


def mixed(job: Job) -> Made:
    """Return the tree of least depth, with fewest gates among those.

    A node with one child costs one gate, a node with two costs four, of which the
    right child is needed one gate later.  So u rungs up, the largest tree has
    N(u) = max(N(u-1), N(u-4) + N(u-3)) + 1 nodes, N(0) = 1.
    """
    rungs = 0
    while _forks(job.controls, rungs) is None:
        rungs += 1
    return _made(job, _least(0, job.controls, rungs))


@cache
def _forks(count: int, rungs: int) -> int | None:
    """Return the fewest two-child nodes of a tree of this size and height."""
    if rungs < 0:
        return None
    if count == 1:
        return 0
    split = _best_split(count, rungs)
    return None if split is None else split[0]


@cache
def _best_split(count: int, rungs: int) -> tuple[int, int] | None:
    """Return (two-child nodes, size of the left subtree; 0 for a single child)."""
    options: list[tuple[int, int]] = []
    single = _forks(count - 1, rungs - 1)
    if single is not None:
        options.append((single, 0))
    for left in range(1, count - 1):
        first = _forks(left, rungs - 4)
        second = _forks(count - 1 - left, rungs - 3)
        if first is not None and second is not None:
            options.append((1 + first + second, left))
    return min(options, default=None)


def _least(first: int, count: int, rungs: int) -> Node:
    """Return the chosen tree on the wires `first` to `first + count - 1`."""
    if count == 1:
        return Node(first)
    split = _best_split(count, rungs)
    if split is None:
        raise ValueError(f"no tree of {count} nodes in {rungs} rungs")
    left = split[1]
    if left == 0:
        return Node(first, (_least(first + 1, count - 1, rungs - 1),))
    right = count - 1 - left
    return Node(
        first,
        (
            _least(first + 1, left, rungs - 4),
            _least(first + 1 + left, right, rungs - 3),
        ),
    )
