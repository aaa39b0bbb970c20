"""The terminal text of a plan, word for word, and what it must never hide."""

from __future__ import annotations

from dataclasses import replace

import pytest

from placer.plan import Bound, Costs
from placer.report.text import plan_text, verdict_line
from tests.report.sample_plan import FIGURES, plan

GOLDEN = """\
FITS: the longest-lived value spends 17.3 % of its lifetime, 50 % is allowed
small on slate-16, 11 sites, 9 swaps, 12.3 us, success 78.9 %

What limits it
limit                plan   allowed    used
--------------------------------------------------------------------
life of a value    17.3 %      50 %  34.6 %  holds  slot 1 of call 1
run time          12.3 us      none       -  holds
sites            11 sites  16 sites  68.8 %  holds
nearest: life of a value is nearest to its limit

Workspace choice against one policy everywhere
policy           sites  swaps     time   error  success   worst  fits
---------------------------------------------------------------------
chosen together     11      9  12.3 us  21.1 %   78.9 %  17.3 %   yes
clean only          11      9  12.3 us  21.1 %   78.9 %  17.3 %   yes
borrowed only       11     17    31 us    39 %     61 %    52 %    no
level 2 only         -      -        -       -        -       -    no
no workspace        11     17    31 us    39 %     61 %    52 %    no
 level 2 only is not possible: no link of the device has a level-2 gate
 worst: largest part of its lifetime that one value lives, here slot 1 of call 1
   (mcx)

Calls (2)
call          recipe            workspace                        planned
------------------------------------------------------------------------
mcx, line 8   clean-ladder      clean $12 $13 $14         0.025 - 6.2 us
mcz, line 10  borrowed-v-chain  borrowed $9 of m[1], $15    6.24 - 11 us

Where the error comes from (21.1 % expected)
 two-qubit gates       40.6 %  ###################
 decay while waiting   25.8 %  ############
 swaps                 22.8 %  ###########
 measurement, reset     7.4 %  ###
 one-qubit gates       3.38 %  ##

How sure
 placement costs 0.211 nats, none costs less than 0.205 (gap 2.84 %): CP-SAT
   9.15 (2 seeds agree)
 error of every plan: at least 0.104 nats, this one 0.236: gates alone, on the
   best links
 9 swaps in the included route, 10.5 on average over 8 routes that the search
   never saw
 checked: every rule held
 all figures are estimates from the calibration of 2026-03-02, made to compare
   plans; no promise
 assumed: every wire is unknown until it is reset
 note: the route was repeated with 8 seeds
"""


def test_golden():
    assert plan_text(plan(), checked="checked: every rule held") == GOLDEN


def test_one_screen_of_eighty_columns():
    lines = plan_text(plan()).splitlines()
    assert max(map(len, lines)) <= 80
    assert lines[0].startswith("FITS: ")


@pytest.mark.parametrize("width", [10, 40, 50, 60, 72, 100])
def test_narrow_and_wide_terminals(width):
    lines = plan_text(plan(), width=width).splitlines()
    assert max(map(len, lines)) <= max(width, 40)
    text = "\n".join(lines)
    for word in ("FITS", "chosen together", "no workspace", "How sure", "2026-03-02"):
        assert word in text


def test_colour_adds_nothing_but_colour():
    import re

    shown = plan_text(plan(), colour=True)
    assert "\x1b[" in shown
    bare = re.sub(r"\x1b\[[0-9;]*m", "", shown)
    assert [x.rstrip() for x in bare.splitlines()] == plan_text(plan()).splitlines()


def test_verdict_is_never_said_twice():
    one = plan()
    verdict = replace(one.verdict, fits=False, sentence="Does not fit: too slow")
    assert verdict_line(replace(one, verdict=verdict)) == "DOES NOT FIT: too slow"
    verdict = replace(verdict, sentence="")
    assert verdict_line(replace(one, verdict=verdict)) == "DOES NOT FIT"


def test_how_sure_names_who_proved_it():
    one = plan()
    none = Bound(10**11, None, "", False, 0, "")
    text = plan_text(replace(one, bound=none))
    assert "no lower bound" in text
    assert "at least" not in text
    proven = Bound(10**11, 10**11, "CP-SAT 9.15", True, 0, "")
    text = plan_text(replace(one, bound=proven))
    assert "no placement costs less (0.1 nats): CP-SAT 9.15" in text


def test_many_calls_are_counted_by_sort():
    one = plan()
    call = one.calls[0]
    many = tuple(
        replace(call, index=i, name=f"mcx{i % 13}", start=1000 * i, end=1000 * i + 900)
        for i in range(40)
    )
    text = plan_text(replace(one, steps=many))
    assert "Calls (40)" in text
    assert "    4  mcx0" in text or "4      mcx0" in text
    assert "and 9 calls of 3 more sorts" in text
    assert len(text.splitlines()) < 60


def test_a_program_without_calls_and_costs():
    one = plan()
    free = replace(FIGURES, costs=Costs(), success=1.0)
    text = plan_text(replace(one, steps=(), figures=free))
    assert "Calls" not in text
    assert "nothing: no cause costs anything" in text
