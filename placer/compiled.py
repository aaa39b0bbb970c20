"""The one way to compile a numeric loop: results never depend on the cache.

Machine code is kept on disk where that is allowed, so that a second run starts fast;
in a place without a writable cache it is compiled anew in every process.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, ParamSpec, TypeVar, cast

import numba

if TYPE_CHECKING:
    from collections.abc import Callable

Parameters = ParamSpec("Parameters")
Result = TypeVar("Result")


def compiled(function: Callable[Parameters, Result]) -> Callable[Parameters, Result]:
    """Return the function compiled; strict floating point, wrapping integers."""
    fast: Any
    try:
        fast = numba.njit(cache=True)(function)
    except RuntimeError:  # nowhere to keep the machine code
        fast = numba.njit(function)
    return cast("Callable[Parameters, Result]", fast)


def inner(function: Callable[Parameters, Result]) -> Callable[Parameters, Result]:
    """Return the function compiled for use by other compiled functions only.

    Without an entry from Python it compiles faster; its machine code is kept on disk
    as part of those that call it.
    """
    options: dict[str, Any] = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}
    fast: Any = numba.njit(**options)(function)
    return cast("Callable[Parameters, Result]", fast)
