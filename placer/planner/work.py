"""How much work each effort does: counts of moves, rounds, routes, solver work.

Counted, never timed, so that the same question gets the same answer everywhere.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

from placer.planner.search import Amount

Effort = Literal["quick", "normal", "deep"]


@dataclass(frozen=True, slots=True)
class Work:
    """How much is done, in counts.

    `search` and `policy` are search amounts, `steps` the most steps that one search
    decodes over all its rounds, `gates` the two-body gates that optional routes may
    have together (`repair_gates`: those of repairs), `routed` the candidates judged
    per search, `windows`, `flips`, `repairs` and `routes` (per final candidate) plain
    counts, `joint` CP-SAT's deterministic time, `joint_size` the largest joint model
    (about its clauses), `embeds` the nodes of one search for a zero-swap placement,
    `turns` the times that a final candidate is followed to its end and back.
    """

    search: Amount
    policy: Amount
    steps: int
    gates: int
    routed: int
    windows: int
    flips: int
    repairs: int
    repair_gates: int
    joint: float
    joint_size: int
    routes: int
    embeds: int
    turns: int


WORK: dict[str, Work] = {
    "quick": Work(
        search=Amount(3, 30_000, (1.0,)),
        policy=Amount(2, 30_000, (1.0,)),
        steps=800,
        gates=20_000,
        routed=2,
        windows=0,
        flips=0,
        repairs=4,
        repair_gates=20_000,
        joint=0.5,
        joint_size=60_000,
        routes=1,
        embeds=100_000,
        turns=1,
    ),
    "normal": Work(
        search=Amount(5, 120_000, (1.0, 0.4, 2.5, 1.0, 0.4, 2.5)),
        policy=Amount(3, 80_000, (1.0, 0.4)),
        steps=2_400,
        gates=250_000,
        routed=20,
        windows=4,
        flips=16,
        repairs=24,
        repair_gates=200_000,
        joint=4.0,
        joint_size=250_000,
        routes=6,
        embeds=1_000_000,
        turns=8,
    ),
    "deep": Work(
        search=Amount(8, 600_000, (1.0, 0.4, 2.5, 0.2)),
        policy=Amount(5, 300_000, (1.0, 0.4)),
        steps=24_000,
        gates=2_000_000,
        routed=16,
        windows=60,
        flips=60,
        repairs=60,
        repair_gates=2_000_000,
        joint=120.0,
        joint_size=3_000_000,
        routes=8,
        embeds=10_000_000,
        turns=30,
    ),
}


def warmed(work: Work) -> Work:
    """Return the work of a plan that starts from an earlier one: a part of it."""
    return replace(
        work,
        search=Amount(1, work.search.moves // 2, (1.0,)),
        policy=Amount(1, work.policy.moves // 2, (1.0,)),
        flips=work.flips // 4,
        windows=work.windows // 2,
        routed=max(1, work.routed // 4),
        repairs=max(2, work.repairs // 4),
        joint=work.joint / 4,
        joint_size=work.joint_size // 4,
        routes=max(1, work.routes // 2),
        embeds=0,
        turns=work.turns // 4,
    )
