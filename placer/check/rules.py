"""Every rule that a plan must keep, one line each, named for its violation.

Each rule is looked after by one function of this room, spoiled by one breaker in
`tests/broken.py`, and has one hand-derived test; a test counts them.
"""

from __future__ import annotations

from typing import NamedTuple


class Rule(NamedTuple):
    """A rule: the name of its violation, and the sentence that must hold."""

    name: str
    sentence: str


RULES: tuple[Rule, ...] = tuple(
    Rule(name, sentence)
    for name, sentence in (
        # What was read.
        ("plan-malformed", "the file follows the published schema, with sane numbers"),
        ("source-changed", "the texts in the plan are those that its hashes name"),
        ("header-misstated", "date and assumptions are those of the sources"),
        ("step-missing", "every step of the program is planned exactly once"),
        ("step-misstated", "kind, name and line of a call are those of the program"),
        ("wire-missing", "the plan names a site for every wire, and for nothing else"),
        ("site-unknown", "every site named exists on the device"),
        ("site-out-of-service", "nothing sits on a site that is out of order"),
        ("recipe-unknown", "every call names a recipe that exists for its size"),
        ("workspace-misstated", "the workspace named is the one that the recipe uses"),
        ("lease-wrong", "a call leases what its recipe asks for, for its own time"),
        ("lost-misstated", "every other recipe of a call is listed once as lost"),
        # What the device and the user allow.
        ("recipe-excluded", "no call uses workspace that was excluded"),
        ("capability-missing", "the device can measure, reset and react as needed"),
        ("level2-missing", "what enters level 2 sits on a site that offers it"),
        ("link-out-of-reach", "everything that must meet can reach a fitting link"),
        # When values are computed and cleaned up.
        ("cleanup-unreadable", "moves name what exists, uses stay in their order"),
        ("value-read-dead", "nothing reads a value before or after its life"),
        ("cleanup-input-changed", "a value meets what it was computed from unchanged"),
        ("record-open", "every measured value is fixed before the end"),
        ("value-left", "no value is left at the end"),
        ("cleanup-differs", "the moves compute what the program as written computes"),
        ("cleanup-misstated", "rows and counts of the cleanup agree with its moves"),
        # The planned schedule.
        ("order-broken", "a step starts after earlier steps on its wires and bits"),
        ("duration-misstated", "a step takes as long as its recipe at its sites"),
        ("two-things-one-site", "a site holds one thing at a time"),
        ("lender-busy", "a lender is idle over the whole lease"),
        ("lender-unlendable", "a wire that must be kept is not lent"),
        ("lender-misstated", "a lease names the wire that holds its site then"),
        ("estimate-misstated", "the placement cost is what its definition gives"),
        # What is computed.
        ("recipe-wrong", "a recipe's circuits do what the call asks for"),
        ("function-differs", "the placed steps compute what the program asks for"),
        ("slot-not-clean", "a clean slot is in |0> when its lease starts"),
        ("slot-not-returned", "a clean slot is in |0> when its lease ends"),
        ("borrowed-changed", "a borrowed site is unchanged when its lease ends"),
        ("workspace-not-returned", "a workspace wire ends in |0>"),
        # The route and its figures.
        ("route-incomplete", "the route does every two-body gate once, in order"),
        ("route-off-link", "gates and swaps of the route happen on usable links"),
        ("level2-off-link", "level-2 gates happen where links and sites offer them"),
        ("swap-while-level2", "what is in level 2 moves only over level-2 links"),
        ("figures-misstated", "every count, time and cost is what the route gives"),
        ("share-misstated", "the longest-lived value and its share are right"),
        ("success-misstated", "success is exp(-expected error)"),
        # What is concluded.
        ("bound-above-estimate", "the lower bound does not pass the placement cost"),
        ("floor-above-cost", "the floor does not pass the expected error"),
        ("proof-misstated", "gap and proof follow from estimate and bound"),
        ("policy-misstated", "a policy's row agrees with itself and the budget"),
        ("limit-misstated", "every limit states the budget and the plan's own value"),
        ("verdict-misstated", "the plan fits exactly if it keeps every limit"),
    )
)

NAMES: tuple[str, ...] = tuple(rule.name for rule in RULES)
