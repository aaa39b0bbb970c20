"""Comparisons: ranking, rows that say why, results that are kept and used again."""

from __future__ import annotations

import dataclasses
import json

import pytest
from click.testing import CliRunner

from placer.cli import main
from placer.compare import Options, fits_somewhere, ranked
from placer.compare.rows import Row, key_of, of_line, to_line
from placer.compare.runs import read_results
from placer.device.read import find_device
from placer.errors import InputError, NoPlan
from placer.plan import Costs, Figures
from placer.program.read import read_program
from placer.report.comparehtml import compare_html
from placer.report.comparetext import compare_data, compare_text
from tests.report.rederive import Page
from tests.report.sample_plan import plan as sample

PROGRAM = """OPENQASM 3.0;
include "stdgates.inc";
qubit[4] berth;
ctrl(3) @ x berth[0], berth[1], berth[2], berth[3];
"""
WIDE = """OPENQASM 3.0;
qubit[14] berth;
"""


def row(device: str, state: str, cost: float, program: str = "ferry") -> Row:
    figures = Figures(
        sites=5,
        swaps=3,
        time_ns=1000,
        two_qubit_gates=9,
        one_qubit_gates=9,
        t_gates=0,
        measurements=0,
        level2_gates=0,
        costs=Costs(swaps=int(cost * 1e12)),
        success=2.718281828**-cost,
        worst_share=0.1,
        worst_value="a",
    )
    return Row(
        key=f"{program}-{device}",
        program=program,
        device=device,
        state=state,  # type: ignore[arg-type]
        choice="clean 2",
        cause="swaps",
        reason="" if state != "cannot run" else "it has 3 sites",
        nearest="",
        calibrated="2026-01-01",
        sites=9,
        gap=None,
        figures=None if state == "cannot run" else figures,
    )


ROWS = (
    row("chert", "cannot run", 0),
    row("slate", "does not fit", 0.1),
    row("marl", "fits", 0.9),
    row("tuff", "fits", 0.3),
)


def test_rank_by_fit_then_error():
    # The least error does not help a device on which the plan does not fit.
    names = [one.device for one in ranked(ROWS)["ferry"]]
    assert names == ["tuff", "marl", "slate", "chert"]


def test_fits_somewhere_wants_a_device_for_every_program():
    assert fits_somewhere(ROWS)
    assert not fits_somewhere((*ROWS, row("tuff", "does not fit", 1, "tug")))


@pytest.mark.parametrize("one", ROWS)
def test_a_row_is_read_as_it_was_written(one):
    assert of_line(to_line(one)) == one


@pytest.mark.parametrize("width", [60, 80, 100])
def test_text_keeps_its_width_and_says_why(width):
    text = compare_text(ROWS, width=width)
    assert max(len(line) for line in text.splitlines()) <= width
    assert text.startswith("ferry: best on tuff, success 74.1 %; fits on 2 of 4")
    assert "chert cannot run it: it has 3 sites" in text


def test_report_of_a_comparison_shows_the_rows_only():
    data = compare_data([*ROWS, row("tuff", "fits", 0.2, "tug")])
    text = compare_html(data)
    page = Page(text)
    assert page._open == []
    for values, _ in page.facts:
        found = data
        for key in values["data-from"].split("/"):
            found = found[int(key)] if isinstance(found, list) else found[key]
        assert float(values["value"]) == found
    # One scale for all: the axes of both programs end at the same number.
    charts = text.split('<svg class="chart"')[1:]
    assert len(charts) == 2
    assert compare_html(data) == text


class Fake:
    """Plans at once; counts, and can be interrupted."""

    def __init__(self) -> None:
        self.asked: list[str] = []
        self.interrupt_at = ""

    def __call__(self, _program, device, **_):
        if device.name == self.interrupt_at:
            raise KeyboardInterrupt
        self.asked.append(device.name)
        if device.name == "shale-12":
            raise NoPlan("no recipe is left")
        return dataclasses.replace(sample(), calibrated=device.calibrated)


@pytest.fixture
def fake(monkeypatch, tmp_path):
    made = Fake()
    monkeypatch.setattr("placer.compare.runs.plan", made)
    monkeypatch.chdir(tmp_path)
    (tmp_path / "ferry.qasm").write_text(PROGRAM)
    return made


DEVICES = ("-d", "slate-16", "-d", "shale-12", "-d", "tuff-10")


def run(*arguments):
    return CliRunner().invoke(main, ["compare", "-q", *arguments])


def test_interrupted_rows_are_kept_and_used_again(fake, tmp_path):
    fake.interrupt_at = "tuff-10"
    result = run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    assert result.exit_code == 130
    assert "interrupted: 1 pair not planned" in result.stdout
    assert "ferry: best on slate-16" in result.stdout
    assert len(read_results(str(tmp_path / "rows.jsonl"))) == 2
    fake.interrupt_at = ""
    result = run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    assert result.exit_code == 0
    assert fake.asked == ["slate-16", "shale-12", "tuff-10"]
    assert "shale-12 cannot run it: no recipe is left" in result.stdout
    again = run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    assert again.stdout == result.stdout


def test_a_cut_last_line_is_planned_again(fake, tmp_path):
    run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    file = tmp_path / "rows.jsonl"
    whole = file.read_text()
    file.write_text(whole[:-40])
    fake.asked.clear()
    run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    assert fake.asked == ["tuff-10"]
    assert file.read_text() == whole


def test_other_options_are_other_questions(fake):
    run("ferry.qasm", *DEVICES, "--results", "rows.jsonl")
    fake.asked.clear()
    run("ferry.qasm", *DEVICES, "--results", "rows.jsonl", "--seed", "1")
    assert len(fake.asked) == 3


def test_key_depends_on_what_is_asked():
    program = read_program(PROGRAM, "ferry.qasm")
    other = read_program(PROGRAM + "// more\n", "ferry.qasm")
    device, tuff = find_device("slate-16"), find_device("tuff-10")
    keys = {
        key_of(program, device, Options()),
        key_of(other, device, Options()),
        key_of(program, tuff, Options()),
        key_of(program, device, Options(share=0.4)),
        key_of(program, device, Options(only=("clean",))),
    }
    assert len(keys) == 5


@pytest.mark.usefixtures("fake")
def test_json_has_rows_and_ranking():
    data = json.loads(run("ferry.qasm", *DEVICES, "--json").stdout)
    # Equal figures: by name.
    assert data["ranking"] == {"ferry": ["slate-16", "tuff-10", "shale-12"]}
    assert len(data["rows"]) == 3


@pytest.mark.usefixtures("fake")
def test_faults_of_all_inputs_come_in_one_pass():
    result = run("ferry.qasm", "no.qasm", "-d", "slate-61", "--results", "r.jsonl")
    assert result.exit_code == 2
    assert "no.qasm" in result.stderr
    assert "slate-61" in result.stderr


def test_a_file_of_something_else_is_refused(tmp_path):
    file = tmp_path / "rows.jsonl"
    file.write_text('{"a": 1}\n')
    with pytest.raises(InputError, match="no row of a comparison"):
        read_results(str(file))


def test_a_real_pair_and_one_that_cannot_run(monkeypatch, tmp_path):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "ferry.qasm").write_text(PROGRAM)
    (tmp_path / "fleet.qasm").write_text(WIDE)
    result = run(
        "ferry.qasm", "fleet.qasm", "-d", "tuff-10", "--effort", "quick",
        "--report", "c.html",
    )  # fmt: skip
    # fleet has 14 wires, tuff-10 has 10 sites.
    assert result.exit_code == 1
    assert "ferry: best on tuff-10" in result.stdout
    assert "tuff-10 cannot run it: the program holds 14 wires" in " ".join(
        result.stdout.split()
    )
    assert "the program holds 14 wires" in (tmp_path / "c.html").read_text()
