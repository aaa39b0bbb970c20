"""Which operations come free when one is done: shared by route and timeline."""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.compiled import inner

if TYPE_CHECKING:
    from placer.placed import Flow, Ints


@inner
def release(flow: Flow, done: int, waits: Ints, free: Ints, count: int) -> int:
    """Append to `free` what waited only for operation `done`; return its new length."""
    for entry in range(flow.first[done], flow.first[done + 1]):
        after = flow.following[entry]
        if after >= 0:
            operation = flow.owner[after]
            waits[operation] -= 1
            if waits[operation] == 0:
                free[count] = operation
                count += 1
    for k in range(flow.heard_first[done], flow.heard_first[done + 1]):
        operation = flow.heard[k]
        waits[operation] -= 1
        if waits[operation] == 0:
            free[count] = operation
            count += 1
    return count


@inner
def begin(waits: Ints, free: Ints) -> int:
    """Put into `free` what waits for nothing, the first on top; return its length."""
    count = 0
    for operation in range(len(waits) - 1, -1, -1):
        if waits[operation] == 0:
            free[count] = operation
            count += 1
    return count
