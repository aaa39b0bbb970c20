"""The published JSON Schemas: texts of the package, and checks of data against them."""

from __future__ import annotations

import json
from importlib.resources import files
from typing import Any

import jsonschema

from placer.errors import InputError, Place, did_you_mean

SCHEMAS: tuple[str, ...] = ("device", "program", "plan")


def schema_text(what: str) -> str:
    """Return the JSON Schema of a `device`, a `program` or a `plan` as text.

    Raises
    ------
    InputError
        If there is no such schema.
    """
    if what not in SCHEMAS:
        raise InputError.at(
            Place("schema"),
            "unknown-schema",
            f"there is no schema '{what}'",
            did_you_mean(what, SCHEMAS) or f"known: {', '.join(SCHEMAS)}",
        )
    source = files("placer") / "schemas" / f"{what}.schema.json"
    return source.read_text(encoding="utf-8")


def faults_of(what: str, data: Any) -> list[str]:
    """Return how data breaks a schema: place and reason, sorted; empty if it fits."""
    validator = jsonschema.Draft202012Validator(json.loads(schema_text(what)))
    found = []
    for error in validator.iter_errors(data):
        place = "/".join(str(part) for part in error.absolute_path) or "(top)"
        found.append(f"{place}: {error.message[:200]}")
    return sorted(found)
