"""Every rule that a plan must keep, one line each, named for its violation."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

RULES: Mapping[str, str] = MappingProxyType(
    {
        "plan-malformed": "the file follows the published schema",
        "source-changed": "the texts in the plan are those that its hashes name",
        "wire-missing": "the plan names a site for every wire, and for nothing else",
        "site-unknown": "every site named exists on the device",
        "site-out-of-service": "nothing sits on a site that is out of order",
        "steps-incomplete": "every step of the program is planned once",
        "recipe-unknown": "every call names a recipe that exists for its size",
        "recipe-excluded": "no call uses workspace that was excluded",
        "capability-missing": "measured cleanup only where the device can measure",
        "level2-missing": "level 2 only on sites that offer it",
        "lease-wrong": "a call has one lease per slot, over exactly its own time",
        "order-broken": "a step starts after every earlier step on its wires",
        "duration-misstated": "a step takes as long as its recipe at its sites",
        "two-things-one-site": "a site holds one thing at a time",
        "lender-busy": "a lender is idle over the whole lease",
        "lender-unlendable": "a wire that must be kept is not lent",
        "lender-misstated": "a lease names the wire that holds its site then",
        "estimate-misstated": "the placement cost is the sum that its definition gives",
        "function-differs": "every call computes what the program asks for",
        "slot-not-clean": "a clean slot is in |0> when its lease starts",
        "slot-not-returned": "a clean slot is in |0> when its lease ends",
        "borrowed-changed": "a borrowed site is unchanged when its lease ends",
        "route-incomplete": "the route does every two-body gate once, in order",
        "route-off-link": "gates and swaps of the route happen on links",
        "level2-off-link": "level-2 gates happen where links and sites offer them",
        "swap-while-level2": "what is in level 2 moves only over level-2 links",
        "figures-misstated": "every figure is what the route gives",
        "success-misstated": "success is exp(-expected error)",
        "bound-above-cost": "no bound passes the cost that it bounds",
        "limit-misstated": "every limit states the budget and the plan's own value",
        "verdict-misstated": "the plan fits exactly if it keeps every limit",
    }
)
