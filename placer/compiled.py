"""The one way to compile a numeric loop: results never depend on the cache.

Machine code is kept on disk where that is allowed, so that a second run starts fast;
in a place without a writable cache it is compiled anew in every process.
"""

from __future__ import annotations

import hashlib
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any, ParamSpec, TypeVar, cast

import numba

if TYPE_CHECKING:
    from collections.abc import Callable

Parameters = ParamSpec("Parameters")
Result = TypeVar("Result")

_PACKAGE = __name__.partition(".")[0]
# The layout of the arrays that most loops read.
_ALWAYS = Path(__file__).with_name("placed.py")


def compiled(function: Callable[Parameters, Result]) -> Callable[Parameters, Result]:
    """Return the function compiled; strict floating point, wrapping integers."""
    # The cache looks at the function's own file only, yet the machine code contains
    # what is called in others: their content becomes part of the name it is kept by.
    function.__qualname__ = f"{function.__qualname__}-{_digest(function)}"
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


def _digest(function: Callable[..., object]) -> str:
    """Return a short digest of the files of this package that a function draws on."""
    names = {function.__module__}
    scope: dict[str, object] = getattr(function, "__globals__", {})
    for value in scope.values():
        module = getattr(value, "__module__", None)
        if isinstance(module, str) and module.split(".")[0] == _PACKAGE:
            names.add(module)
    files = {_ALWAYS}
    for name in names:
        file = getattr(sys.modules.get(name), "__file__", None)
        if file is not None:
            files.add(Path(file))
    digest = hashlib.sha256()
    for path in sorted(files):
        digest.update(path.read_bytes())
    return digest.hexdigest()[:8]
