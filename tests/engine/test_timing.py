"""Calls run side by side where sites allow, and one after the other where not."""

from __future__ import annotations

import pytest

import placer
from placer.device.model import Budget
from placer.program.read import read_program

TWO_CALLS = """OPENQASM 3.0;
include "stdgates.inc";
qubit[4] a;
qubit[4] b;
ctrl(3) @ x a[0], a[1], a[2], a[3];
ctrl(3) @ x b[0], b[1], b[2], b[3];
"""


def planned(budget: Budget) -> tuple[placer.Plan, bool]:
    plan = placer.plan(
        read_program(TWO_CALLS, "two.qasm"), "slate-16", budget=budget, only=["clean"]
    )
    one, two = plan.calls
    return plan, one.start < two.end and two.start < one.end


def test_two_calls_overlap_when_each_has_its_own_clean_site() -> None:
    plan, is_overlapping = planned(Budget())
    assert is_overlapping
    leased = {lease.site for call in plan.calls for lease in call.leases}
    assert len(leased) >= 2


def test_two_calls_take_turns_when_one_clean_site_is_left() -> None:
    # Eight wires hold eight of nine sites; both calls need a clean one.
    plan, is_overlapping = planned(Budget(most_sites=9))
    assert not is_overlapping
    assert plan.figures.sites <= 9
    leased = {lease.site for call in plan.calls for lease in call.leases}
    assert len(leased) == 1


@pytest.mark.parametrize("policy", ["clean", "borrowed", "none"])
def test_only_limits_every_call(policy: str) -> None:
    plan = placer.plan(
        read_program(TWO_CALLS, "two.qasm"), "slate-16", only=[policy], effort="quick"
    )
    assert {call.workspace for call in plan.calls} == {policy}


def test_no_measured_cleanup_where_the_device_cannot() -> None:
    plan = placer.plan(read_program(TWO_CALLS, "two.qasm"), "chert-27", effort="quick")
    for call in plan.calls:
        assert "measured" not in call.recipe
        reasons = dict(call.lost)
        assert reasons["clean-measured"] == "the device has no measured cleanup"


MEASURED = """OPENQASM 3.0;
include "stdgates.inc";
qubit[3] q;
bit c;
ctrl(2) @ x q[0], q[1], q[2];
c = measure q[2];
c = measure q[0];
barrier q;
"""


def test_measurements_into_one_bit_keep_their_order() -> None:
    # Found by the check: q[0] is free long before q[2], so without a rule its
    # measurement would come first and the bit would end with another value.
    plan = placer.plan(read_program(MEASURED, "measured.qasm"), "chert-27")
    first, second = (step for step in plan.steps if step.kind == "measure")
    assert first.end <= second.start


def test_a_measured_wire_cannot_go_on_where_the_device_measures_only_at_the_end() -> (
    None
):
    text = MEASURED + "h q[2];\n"
    with pytest.raises(placer.InputError, match="no-mid-circuit-measurement"):
        placer.plan(read_program(text, "measured.qasm"), "chert-27")


def test_a_limit_that_leaves_no_recipe_says_what_its_own_recipes_lack() -> None:
    with pytest.raises(placer.NoPlan) as caught:
        placer.plan("full-berths", "tuff-10", only=["clean"])
    text = str(caught.value)
    assert "clean-half: needs 1 clean site, 0 can be free" in text
    assert "none-linear" not in text
