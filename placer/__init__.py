"""Choose recipes, workspace, lenders and sites for the calls of a quantum program.

`plan(program, device)` does the whole job and returns a checked `Plan`; `check(text)`
verifies a plan's JSON.  Both load the solver only when they are called.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import placer.check  # noqa: F401 - see the comment below
from placer.device.model import Budget
from placer.errors import CheckFailed, InputError, InternalError, NoPlan, OutOfTime

# Modules that share a name with a function must be loaded before the function is
# bound: importing them later would put the module in the function's place.
from placer.plan import Plan, show_with, to_json
from placer.version import VERSION

__version__ = VERSION
__all__ = [
    "Budget",
    "CheckFailed",
    "InputError",
    "InternalError",
    "NoPlan",
    "OutOfTime",
    "Plan",
    "check",
    "plan",
    "to_json",
]


def _picture(plan: Plan) -> str:
    from placer.report.notebook import picture

    return picture(plan)


show_with(_picture)

if TYPE_CHECKING:
    from placer.api import check, plan
else:

    def plan(program: Any, device: Any, **options: Any) -> Plan:
        """Plan a program on a device; see `placer.api.plan` for every option."""
        from placer import api

        return api.plan(program, device, **options)

    def check(text: str, path: str = "plan") -> Any:
        """Verify a plan's JSON text from the text alone; see `placer.api.check`."""
        from placer import api

        return api.check(text, path)
