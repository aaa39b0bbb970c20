"""A plan whose values are cleaned up in another order, with a measured record."""

from __future__ import annotations

from functools import cache
from unittest import mock

from placer.device.read import find_device
from placer.plan import to_json
from placer.planner import settle as settling
from placer.planner.assemble import plan_of
from placer.planner.orders import game_of, orders_of
from placer.problem import make_problem
from placer.program.read import read_program
from placer.program.values import values_of

LADDER = """\
name: rung
registers:
  a: {width: 4, start: zero}
  t: {width: 2, start: zero}
steps:
  - h: a
  - scope:
      name: s
      workspace: {v: 3}
      compute:
        - and: {controls: [a.0, a.1], into: v.0}
        - and: {controls: [v.0, not a.2], into: v.1}
        - and: {controls: [v.1, a.3], into: v.2}
      body:
        - cx: v[2], t[0]
        - h: t[1]
        - cx: v[0], t[1]
        - cx: v[2], t[1]
  - h: a[2]
  - cx: t[0], t[1]
"""


@cache
def reordered() -> str:
    """Return the JSON text of a plan that follows an order with a record."""
    problem = make_problem(find_device("slate-16"), read_program(LADDER, "r.yaml"))
    program = problem.program
    graph = values_of(program)
    game = game_of(program, graph, problem.device)
    orders, curve = orders_of(program, game, graph, "quick")
    chosen = [o for o in orders if any(m.action == "drop" for m in o.moves)]
    with mock.patch.object(settling, "orders_of", return_value=(chosen[:1], curve)):
        outcome, cleanup = settling.settle(
            problem,
            asked="optimised",
            effort="quick",
            seed=0,
            progress=lambda _: None,
        )
    plan = plan_of(
        outcome, version="0", seed=0, effort="quick", notes=(), cleanup=cleanup
    )
    return to_json(plan)
