"""The published schemas are valid themselves, and real data keeps them."""

from __future__ import annotations

import json
import re
from pathlib import Path

import jsonschema
import pytest
import yaml

import placer.program
from placer.errors import InputError
from placer.plan import to_json
from placer.program.read import read_program
from placer.report.schema import SCHEMAS, faults_of, schema_text
from tests.report.sample_plan import plan

DEVICES = sorted((Path(__file__).parents[2] / "devices").glob("*.yaml"))
_NUMBER = re.compile(r"[-+]?[0-9]+(\.[0-9]*)?(e[-+]?[0-9]+)?")


def typed(value):
    """Turn plain scalars into what a YAML 1.2 reader would make of them."""
    if isinstance(value, dict):
        return {str(k): typed(v) for k, v in value.items()}
    if isinstance(value, list):
        return [typed(v) for v in value]
    if value == "":
        return None
    if value in ("true", "false"):
        return value == "true"
    if _NUMBER.fullmatch(value):
        return int(value) if value.isdigit() else float(value)
    return value


@pytest.mark.parametrize("what", SCHEMAS)
def test_schema_is_a_schema(what):
    schema = json.loads(schema_text(what))
    jsonschema.Draft202012Validator.check_schema(schema)
    assert schema["additionalProperties"] is False


def test_plan_keeps_its_schema():
    assert faults_of("plan", json.loads(to_json(plan()))) == []


def objects(data, path=()):
    """Yield the path of every object of some data."""
    if isinstance(data, dict):
        yield path
        for key, value in data.items():
            yield from objects(value, (*path, key))
    elif isinstance(data, list):
        for number, value in enumerate(data[:1]):
            yield from objects(value, (*path, number))


PATHS = list(objects(json.loads(to_json(plan()))))


@pytest.mark.parametrize("path", [p for p in PATHS if p != ("wires",)], ids=str)
def test_no_object_of_a_plan_may_gain_or_lose_a_key(path):
    def at(data):
        for key in path:
            data = data[key]
        return data

    data = json.loads(to_json(plan()))
    at(data)["surprise"] = 1
    assert faults_of("plan", data)
    for key in at(json.loads(to_json(plan()))):
        data = json.loads(to_json(plan()))
        del at(data)[key]
        assert faults_of("plan", data), key


@pytest.mark.parametrize("path", DEVICES, ids=lambda p: p.stem)
def test_shipped_devices_keep_the_schema(path):
    data = typed(yaml.load(path.read_text(), Loader=yaml.BaseLoader))
    assert faults_of("device", data) == []
    data["sites"]["t3_us"] = 5
    data["links"]["error"] = 1.2
    assert len(faults_of("device", data)) == 2


def described_program() -> str:
    """Return the program that the description of the format shows."""
    folder = Path(placer.program.__file__).parent
    text = (folder / "program-yaml.md").read_text()
    return text.split("```yaml\n")[1].split("```")[0]


def test_the_described_program_keeps_the_schema():
    text = described_program()
    data = typed(yaml.load(text, Loader=yaml.BaseLoader))
    assert faults_of("program", data) == []
    used = {key for step in data["steps"] for key in step}
    assert {"mcx", "mcz", "mcp", "scope", "repeat", "measure"} <= used


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("registers:", "register:"),
        ("start: zero}", "start: one}"),
        ("start: zero}", "begin: zero}"),
        ("width: 4", "width: 0"),
        ("- h: a ", "- hh: a "),
        ("target: t}", "goal: t}"),
        ("times: 3", "times: many"),
        ("compute:", "computes:"),
    ],
)
def test_the_schema_refuses_what_the_reader_refuses(old, new):
    text = described_program()
    read_program(text, "described.yaml")
    assert old in text
    text = text.replace(old, new, 1)
    assert faults_of("program", typed(yaml.load(text, Loader=yaml.BaseLoader)))
    with pytest.raises(InputError):
        read_program(text, "described.yaml")


def test_unknown_schema_is_an_input_error():
    with pytest.raises(InputError, match="did you mean 'plan'"):
        schema_text("plans")
