"""Is this data a plan at all: the published schema, sane numbers, plain text.

In: parsed JSON.  Out: (where, what) of each fault.  The long lists are looked at by
plain loops, since a schema validator needs many seconds for them.
"""

from __future__ import annotations

import json
import math
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import jsonschema

if TYPE_CHECKING:
    from collections.abc import Iterable

SCHEMA = Path(__file__).parent.parent / "schemas" / "plan.schema.json"
MOST_FAULTS = 20
LARGEST = 2**62

Fault = tuple[str, str]


def faults_of(data: dict[str, Any]) -> list[Fault]:
    """Return what is wrong with the shape of a plan, sorted by place."""
    found = [*_odd_values(data), *_odd_rows(data)]
    if not found:
        try:
            found = _against_schema(_shortened(data))
        except RecursionError:
            found = [("plan", "nested too deeply")]
    return sorted(found)[:MOST_FAULTS]


@cache
def _validator() -> Any:
    schema = json.loads(SCHEMA.read_text(encoding="utf-8"))
    base = jsonschema.Draft202012Validator
    # JSON Schema takes 50.0 for an integer; a plan writes 50.
    types = base.TYPE_CHECKER.redefine("integer", lambda _, value: _is_whole(value))
    extend: Any = jsonschema.validators.extend
    return extend(base, type_checker=types)(schema)


def _is_whole(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool)


def _against_schema(data: dict[str, Any]) -> list[Fault]:
    found: list[Fault] = []
    for error in _validator().iter_errors(data):
        where = "/".join(str(part) for part in error.absolute_path) or "plan"
        found.append((where, error.message[:200]))
        if len(found) == MOST_FAULTS:
            break
    return found


def _odd_values(data: dict[str, Any]) -> list[Fault]:
    """Find numbers that are not finite or beyond all measure, and broken text."""
    found: list[Fault] = []
    waiting: list[tuple[str, Any]] = [("plan", data)]
    while waiting and len(found) < MOST_FAULTS:
        where, value = waiting.pop()
        if isinstance(value, dict):
            waiting.extend((key, key) for key in value)
            waiting.extend(value.items())
        elif isinstance(value, list):
            waiting.extend((where, one) for one in value)
        elif isinstance(value, str):
            if not _is_plain(value):
                found.append((ascii(where), "this text is not valid Unicode"))
        elif isinstance(value, int) and abs(value) > LARGEST:
            found.append((where, "this number is beyond all measure"))
        elif isinstance(value, float) and not math.isfinite(value):
            found.append((where, f"{value} is no number to plan with"))
    return found


def _is_plain(text: str) -> bool:
    try:
        text.encode("utf-8")
    except UnicodeEncodeError:
        return False
    return True


def _odd_rows(data: dict[str, Any]) -> list[Fault]:
    """Find rows of the long lists that are not lists of whole numbers from 0 up."""
    route = data.get("route")
    route = route if isinstance(route, dict) else {}
    found = [*_rows("others", data.get("others"), 3)]
    found += _rows("route/swaps", route.get("swaps"), 2)
    gaps = route.get("gaps")
    if not isinstance(gaps, list) or not gaps:
        return [*found, ("route/gaps", "a list with one entry or more is needed")]
    for number, runs in enumerate(gaps):
        found += _rows(f"route/gaps/{number}", runs, 2)
        if len(found) > MOST_FAULTS:
            break
    return found


def _rows(where: str, rows: object, width: int) -> list[Fault]:
    if not isinstance(rows, list):
        return [(where, "a list is needed")]
    return [
        (f"{where}/{number}", f"{width} whole numbers are needed")
        for number, row in _odd(rows, width)
    ]


def _odd(rows: list[Any], width: int) -> Iterable[tuple[int, Any]]:
    for number, row in enumerate(rows):
        if (
            not isinstance(row, list)
            or len(row) != width
            or not all(_is_whole(value) and value >= 0 for value in row)
        ):
            yield number, row


def _shortened(data: dict[str, Any]) -> dict[str, Any]:
    """Return the data with one row of each long list."""
    route = dict(data["route"])
    route["gaps"] = route["gaps"][:1]
    route["swaps"] = route["swaps"][:1]
    return {**data, "others": data["others"][:1], "route": route}
