"""Turn the engine's outcome into a plan: names, leases, reasons, bound, verdict."""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.plan import Bound, Lease, Plan, PolicyRow, Source, Step
from placer.planner import bounds
from placer.planner.explain import reasons
from placer.planner.placement import evaluate
from placer.planner.verdict import nearest_change, overrun, verdict_of

if TYPE_CHECKING:
    from placer.plan import Cleanup
    from placer.planner.loop import Outcome, PolicyOutcome


def plan_of(
    outcome: Outcome,
    *,
    version: str,
    seed: int,
    effort: str,
    notes: tuple[str, ...],
    cleanup: Cleanup | None = None,
) -> Plan:
    """Return the plan of an outcome, ready to be written and checked."""
    problem = outcome.instance.problem
    program, device = problem.program, problem.device
    budget = problem.budget
    judged = outcome.judged
    placement = judged.placement
    nearest = ""
    if overrun(judged.figures, budget) > 0:
        nearest = nearest_change(outcome.seen, budget)
    return Plan(
        version=version,
        program=Source(
            program.name, program.path, program.syntax, program.hash, program.text
        ),
        device=Source(device.name, device.path, "yaml", device.hash, device.text),
        calibrated=device.calibrated,
        open_inputs=program.open_inputs,
        assumed=program.assumed,
        budget=budget,
        goal=problem.goal,
        only=problem.only,
        seed=seed,
        effort=effort,
        wires={name: placement.sites[w] for w, name in enumerate(program.wire_names)},
        steps=_steps(outcome),
        route=judged.route,
        figures=judged.figures,
        bound=Bound(
            estimate=judged.estimate,
            least=outcome.least,
            by=outcome.least_by,
            proven=outcome.is_proven,
            floor=outcome.floor,
            floor_by=bounds.FLOOR_RULE,
        ),
        policies=tuple(_row(p, outcome) for p in outcome.policies),
        verdict=verdict_of(judged.figures, budget, nearest),
        notes=(*_why(outcome), *outcome.notes, *notes),
        cleanup=cleanup,
    )


def _why(outcome: Outcome) -> tuple[str, ...]:
    """Say how the chosen plan stands against the best fixed policy."""
    budget = outcome.instance.problem.budget
    rows = []
    for policy in outcome.policies:
        if policy.judged is not None:
            figures = policy.judged.figures
            misses = overrun(figures, budget) > 0
            rows.append((misses, figures.costs.total, policy.policy))
    if not rows:
        return ()
    misses, cost, name = min(rows)
    own = outcome.judged.figures.costs.total
    difference = (cost - own) / own if own else 0.0
    side = "more" if difference >= 0 else "less"
    text = (
        f"the best single policy is {name}: {abs(difference):.0%} {side} expected "
        "error than this plan"
    )
    return (text + (", and it does not fit" if misses else ""),)


def _steps(outcome: Outcome) -> tuple[Step, ...]:
    instance = outcome.instance
    program = instance.problem.program
    placement = outcome.judged.placement
    evaluation = evaluate(instance, placement)
    lost = reasons(instance, placement)
    steps = []
    for op in program.operations:
        i = op.index
        profile = instance.profiles[i][placement.recipes[i]]
        start, end = placement.starts[i], evaluation.ends[i]
        leases = []
        for slot, site in enumerate(placement.slot_sites[i]):
            lender = evaluation.lenders[i][slot]
            name = program.wire_names[lender] if lender >= 0 else None
            kind = profile.built.slots[slot]
            leases.append(Lease(slot, site, kind, start, end, name))
        steps.append(
            Step(
                index=i,
                kind=op.kind,
                name=op.name,
                line=op.place.line,
                recipe=profile.built.recipe,
                workspace=profile.built.workspace,
                start=start,
                end=end,
                leases=tuple(leases),
                lost=lost[i],
            )
        )
    return tuple(steps)


def _row(policy: PolicyOutcome, outcome: Outcome) -> PolicyRow:
    judged = policy.judged
    if judged is None:
        return PolicyRow(policy.policy, False, policy.reason, False, None, None)
    fits = overrun(judged.figures, outcome.instance.problem.budget) == 0
    return PolicyRow(policy.policy, True, "", fits, judged.figures, judged.estimate)
