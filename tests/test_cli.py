"""The commands: exit statuses, streams, files whole or not at all."""

from __future__ import annotations

import dataclasses
import json
import os
import subprocess
import sys
import types
from pathlib import Path

import openqasm3
import pytest
from click.testing import CliRunner

from placer.cli import CHECKED, main
from placer.device.model import Budget
from placer.errors import InputError, InternalError, NoPlan, OutOfTime, Place
from placer.plan import to_json
from placer.report.outputs import check_targets, write_all
from placer.report.text import plan_text
from tests.report.sample_plan import SOURCE, plan, program


@dataclasses.dataclass
class Finding:
    rule: str
    where: str
    what: str


@dataclasses.dataclass
class Checked:
    ok: bool
    findings: tuple[Finding, ...] = ()
    rules: tuple[str, ...] = ("two-holders-one-site", "cost-misstated")
    notes: tuple[str, ...] = ()


class Fake:
    """Stands for the planner and the readers; keeps what it was asked."""

    def __init__(self) -> None:
        self.asked: dict = {}
        self.outcome: object = plan()
        self.checked = Checked(True)

    def plan(self, source, device, **options):
        self.asked = {"program": source, "device": device, **options}
        options["progress"]("placing")
        if isinstance(self.outcome, BaseException):
            raise self.outcome
        return self.outcome

    def check_plan(self, text, path):
        self.asked = {"text": text, "path": path}
        return self.checked

    def load_program(self, name, *, open_inputs):
        if "bad" in name:
            raise InputError.at(Place(name, 3, 1), "unknown-gate", "no gate 'foo'")
        return dataclasses.replace(program(), open_inputs=open_inputs)

    def read_program(self, text, path, *, open_inputs):
        named = f"{path}: {len(text)} signs"
        return dataclasses.replace(program(), name=named, open_inputs=open_inputs)


@pytest.fixture
def fake(monkeypatch):
    made = Fake()

    def module(name, **members):
        new = types.ModuleType(name)
        for key, value in members.items():
            setattr(new, key, value)
        monkeypatch.setitem(sys.modules, name, new)

    module("placer.api", plan=made.plan)
    module("placer.check.verify", check_plan=made.check_plan)
    module(
        "placer.program.read",
        load_program=made.load_program,
        read_program=made.read_program,
    )
    return made


@pytest.fixture
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "small.qasm").write_text(SOURCE)
    return tmp_path


def run(*words: str, **more):
    return CliRunner().invoke(main, list(words), **more)


PLAN = ("plan", "small.qasm", "-d", "slate-16")


@pytest.mark.usefixtures("folder")
def test_a_plan_that_fits(fake):
    result = run(*PLAN)
    assert result.exit_code == 0, result.output
    assert result.stdout.startswith("FITS: ")
    assert result.stderr == ""
    assert fake.asked["seed"] == 0
    assert fake.asked["effort"] == "normal"
    assert fake.asked["only"] == ()
    assert fake.asked["open_inputs"] is False
    assert fake.asked["budget"] == Budget()


@pytest.mark.usefixtures("folder")
def test_options_reach_the_planner(fake):
    options = "--budget 0.3 --least-success 0.2 --most-sites 9 --effort deep --seed 7"
    words = f"{options} --only clean --only none --open-inputs".split()
    assert run(*PLAN, *words).exit_code == 0
    assert fake.asked["budget"] == Budget(0.3, 0.2, 9, None)
    assert fake.asked["effort"] == "deep"
    assert fake.asked["seed"] == 7
    assert fake.asked["only"] == ("clean", "none")
    assert fake.asked["open_inputs"] is True
    assert fake.asked["program"].open_inputs is True


def test_a_plan_that_does_not_fit(fake, folder):
    one = plan()
    verdict = dataclasses.replace(one.verdict, fits=False, sentence="too slow")
    fake.outcome = dataclasses.replace(one, verdict=verdict)
    result = run(*PLAN, "--plan", "out.json")
    assert result.exit_code == 1
    assert result.stdout.startswith("DOES NOT FIT: too slow")
    assert json.loads((folder / "out.json").read_text())["verdict"]["fits"] is False


@pytest.mark.parametrize(
    ("error", "status", "said"),
    [
        (NoPlan("3 wires, 2 sites"), 1, "no plan is possible: 3 wires, 2 sites"),
        (OutOfTime("after 3 starts"), 3, "--effort deep"),
        (InternalError("rule x"), 70, "this is a bug of placer"),
        (ZeroDivisionError("oh"), 70, "ZeroDivisionError: oh"),
        (KeyboardInterrupt(), 130, "interrupted"),
        (InputError.at(Place("f", 2), "c", "w", "h"), 2, "f:2: error[c]: w\n  help: h"),
    ],
)
def test_every_failure_has_its_status_and_writes_nothing(
    fake, folder, error, status, said
):
    fake.outcome = error
    result = run(*PLAN, "--plan", "out.json", "--qasm", "out.qasm")
    assert result.exit_code == status
    assert said in result.stderr
    assert result.stdout == ""
    assert sorted(p.name for p in folder.iterdir()) == ["small.qasm"]


@pytest.mark.usefixtures("fake", "folder")
def test_faults_of_both_inputs_come_in_one_pass():
    result = run("plan", "bad.qasm", "-d", "slate-61")
    assert result.exit_code == 2
    assert "bad.qasm:3:1: error[unknown-gate]" in result.stderr
    assert "there is no device 'slate-61'" in result.stderr
    assert "did you mean 'slate-16'?" in result.stderr


@pytest.mark.usefixtures("fake", "folder")
@pytest.mark.parametrize(
    "words",
    [
        ("plan",),
        ("plan", "small.qasm"),
        (*PLAN, "--budget", "nan"),
        (*PLAN, "--budget", "0"),
        (*PLAN, "--least-success", "1.5"),
        (*PLAN, "--most-sites", "0"),
        (*PLAN, "--only", "dirty"),
        (*PLAN, "--seed", "-1"),
        (*PLAN, "--effort", "huge"),
        (*PLAN, "--json", "--plan", "-"),
        (*PLAN, "--qasm", "-", "--plan", "-"),
        ("schema", "plans"),
        ("fly",),
    ],
)
def test_usage_errors(words):
    result = run(*words)
    assert result.exit_code == 2
    assert result.stdout == ""


@pytest.mark.usefixtures("fake")
def test_files_are_written(folder):
    result = run(*PLAN, "--plan", "out.json", "--qasm", "out.qasm")
    assert result.exit_code == 0
    assert (folder / "out.json").read_text() == to_json(plan())
    text = (folder / "out.qasm").read_text()
    openqasm3.parse(text)
    assert "Toffoli level" in text
    names = sorted(p.name for p in folder.iterdir())
    assert names == ["out.json", "out.qasm", "small.qasm"]
    run(*PLAN, "--qasm", "out.qasm", "--gates", "clifford-t")
    assert "Clifford+T level" in (folder / "out.qasm").read_text()


@pytest.mark.usefixtures("fake")
def test_stdout_takes_one_result(folder):
    result = run(*PLAN, "--json")
    assert result.stdout == to_json(plan())
    assert result.stderr.startswith("FITS: ")
    result = run(*PLAN, "--plan", "-", "-q")
    assert result.stdout == to_json(plan())
    assert result.stderr == ""
    result = run(*PLAN, "--qasm", "-", "--plan", "p.json")
    assert result.stdout.startswith("OPENQASM 3.0;\n")
    assert (folder / "p.json").exists()


@pytest.mark.parametrize(
    ("target", "code"),
    [
        ("no/such/out.json", "no-folder"),
        (".", "not-a-file"),
        ("/dev/null", "not-a-file"),
        ("small.qasm", "is-input"),
        ("./link.qasm", "is-input"),
    ],
)
def test_targets_are_tested_before_the_work(fake, folder, target, code):
    (folder / "link.qasm").symlink_to(folder / "small.qasm")
    result = run(*PLAN, "--plan", target, "--qasm", "fine.qasm")
    assert result.exit_code == 2
    assert f"error[{code}]" in result.stderr
    assert fake.asked == {}
    assert (folder / "small.qasm").read_text() == SOURCE


@pytest.mark.usefixtures("fake", "folder")
def test_two_outputs_in_one_file():
    result = run(*PLAN, "--plan", "a", "--qasm", "./a")
    assert result.exit_code == 2
    assert "error[named-twice]" in result.stderr


def test_outputs_keep_old_files_when_one_fails(folder):
    (folder / "one").write_text("old")
    (folder / "one").chmod(0o640)
    write_all({"one": "new"})
    assert (folder / "one").read_text() == "new"
    assert (folder / "one").stat().st_mode & 0o777 == 0o640
    with pytest.raises(InputError, match="not-written"):
        write_all({"one": "newer", "gone/two": "x"})
    assert (folder / "one").read_text() == "new"
    assert sorted(p.name for p in folder.iterdir()) == ["one", "small.qasm"]
    check_targets(["-", "-"])


def test_a_link_keeps_pointing(folder):
    (folder / "real").write_text("old")
    (folder / "link").symlink_to("real")
    write_all({"link": "new"})
    assert (folder / "link").is_symlink()
    assert (folder / "real").read_text() == "new"


def test_check(fake, folder):
    (folder / "p.json").write_text(to_json(plan()))
    result = run("check", "p.json")
    assert result.exit_code == 0
    assert result.stdout.startswith("CHECK PASSED: p.json keeps 2 rules\n")
    assert fake.asked["text"] == to_json(plan())
    broken = Finding("cost-misstated", "figures/costs/swaps", "says 3, is 4")
    fake.checked = Checked(False, (broken,))
    result = run("check", "p.json")
    assert result.exit_code == 1
    assert "cost-misstated at figures/costs/swaps: says 3, is 4" in result.stdout
    result = run("check", "p.json", "--json")
    assert result.exit_code == 1
    assert json.loads(result.stdout)["findings"][0]["rule"] == "cost-misstated"
    assert run("check", "none.json").exit_code == 2
    (folder / "raw").write_bytes(b"\xff\xfe")
    assert "not-text" in run("check", "raw").stderr


def test_show_device():
    result = run("show", "slate-16")
    assert result.exit_code == 0
    assert result.stdout.startswith("slate-16: 16 sites in service, 24 usable links")
    assert "0----1----2----3\n|    |    |    |\n4----5" in result.stdout
    data = json.loads(run("show", "breccia-27", "--json").stdout)
    assert data["what"] == "device"
    assert data["out_of_order"] == [8, 18, 25]
    assert "$8, $18, $25" in run("show", "breccia-27").stdout


@pytest.mark.usefixtures("fake", "folder")
def test_show_program():
    result = run("show", "small.qasm")
    assert result.exit_code == 0
    assert result.stdout.startswith("small: 8 wires, 6 steps, 2 calls")
    data = json.loads(run("show", "small.qasm", "--json").stdout)
    # While the five-control call runs only m[0] and m[1] are free.
    assert [c["could_be_lent"] for c in data["calls"]] == [2, 3]


@pytest.mark.usefixtures("fake")
def test_show_tells_files_apart(folder):
    shipped = Path(__file__).parents[1] / "devices" / "tuff-10.yaml"
    (folder / "mine.yaml").write_text(shipped.read_text())
    assert run("show", "mine.yaml").stdout.startswith("tuff-10:")
    (folder / "steps.yaml").write_text("registers: {}\nsteps: []\n")
    assert run("show", "steps.yaml").stdout.startswith("small:")
    (folder / "source").write_text("// note\nOPENQASM 2.0;\n")
    assert run("show", "source").stdout.startswith("small:")
    (folder / "p.json").write_text(to_json(plan()))
    result = run("show", "p.json")
    assert result.exit_code == 0
    assert result.stdout == plan_text(plan(), checked=CHECKED)
    (folder / "x.txt").write_text("hello")
    assert "error[neither]" in run("show", "x.txt").stderr
    result = run("show", "slate-61")
    assert result.exit_code == 2
    assert "did you mean 'slate-16'?" in result.stderr


@pytest.mark.usefixtures("fake")
def test_demo_programs_are_found_by_name(folder, monkeypatch):
    demo = folder / "ripple.qasm"
    demo.write_text("x" * 7)
    for module in ("placer.cli", "placer.report.sorts"):
        monkeypatch.setattr(f"{module}.demo_programs", lambda: {"ripple": demo})
    assert run("show", "ripple").stdout.startswith("ripple.qasm: 7 signs: 8 wires")
    assert "demo programs: ripple" in run("show", "riple").stderr
    for words in (("show", "riple"), ("plan", "riple", "-d", "slate-16")):
        assert "did you mean 'ripple'?" in run(*words).stderr


@pytest.mark.parametrize("what", ["device", "program", "plan"])
def test_schema(what):
    result = run("schema", what)
    assert result.exit_code == 0
    assert json.loads(result.stdout)["$id"] == f"urn:placer:{what}:1"


def test_help_names_every_command_and_status():
    text = run("--help").stdout
    for word in ("plan", "check", "show", "schema", "70 a bug"):
        assert word in text
    assert run("--version").stdout == "placer 0.1.0\n"


def test_a_process_of_its_own(folder):
    def process(*words):
        return subprocess.run(
            [sys.executable, "-m", "placer.cli", *words],
            capture_output=True,
            text=True,
            check=False,
            cwd=folder,
            env={**os.environ, "PYTHONWARNINGS": "error"},
        )

    done = process("show", "shale-12")
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith("shale-12: 12 sites")
    done = process("show", "nothing")
    assert done.returncode == 2
    assert done.stdout == ""
    assert "error[not-found]" in done.stderr
    done = process("plan")
    assert done.returncode == 2
