"""Device files: what they mean, what is refused, and what travels along."""

import datetime
import hashlib
import math
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from placer.device import lattices
from placer.device.model import Budget, Capabilities, Level2, TGate
from placer.device.read import find_device, read_device, shipped_devices
from placer.errors import InputError

ROOT = Path(__file__).resolve().parents[2]
BAD = sorted((ROOT / "tests" / "bad" / "device").glob("*.yaml"))

TOY = """\
name: toy-4
note: >-
  A toy,
  in two lines.
calibrated: 2026-01-05
lattice: {kind: line, sites: 4}
sites:
  t1_us: 80
  t2_us: 60
  gate_error: 3e-4
  gate_time_ns: 30
  readout_error: 0.01
  readout_time_ns: 300
  reset_error: 0.02
  reset_time_ns: 500
links: {error: 6e-3, time_ns: 50}
capabilities:
  mid_circuit_measurement: true
  conditional_latency_ns: 400
  reset: true
"""

LEVEL2 = (
    TOY.replace(
        "  reset_time_ns: 500\n",
        "  reset_time_ns: 500\n  level2: {t1_us: 40, error: 3e-3, time_ns: 35}\n",
    )
    .replace("time_ns: 50}", "time_ns: 50, level2: {error: 9e-3, time_ns: 120}}")
    .replace("  reset: true\n", "  reset: true\n  level2_sites: [0, 1]\n")
)


def faults_of(text: str) -> list[str]:
    with pytest.raises(InputError) as caught:
        read_device(text, "toy.yaml")
    return [str(fault) for fault in caught.value.faults]


def test_toy_means_what_it_says() -> None:
    device = read_device(TOY, "toy.yaml")
    assert device.name == "toy-4"
    assert device.note == "A toy, in two lines."
    assert device.calibrated == "2026-01-05"
    assert device.lattice == "line of 4"
    assert device.capabilities == Capabilities(
        mid_circuit_measurement=True, conditional_ns=400, reset=True
    )
    assert device.capabilities.measured_cleanup
    assert device.t_gate is None
    assert device.budget == Budget()
    assert device.text == TOY
    assert device.path == "toy.yaml"
    assert device.hash == hashlib.sha256(TOY.encode()).hexdigest()
    assert [site.id for site in device.sites] == [0, 1, 2, 3]
    site = device.sites[2]
    assert (site.t1_us, site.t2_us) == (80.0, 60.0)
    assert (site.gate_error, site.gate_ns) == (3e-4, 30)
    assert (site.readout_error, site.readout_ns) == (0.01, 300)
    assert (site.reset_error, site.reset_ns) == (0.02, 500)
    assert site.prep_error == 0.0
    assert site.level2 is None
    assert site.in_service
    assert site.xy == (2.0, 0.0)
    assert [(link.a, link.b) for link in device.links] == [(0, 1), (1, 2), (2, 3)]
    link = device.link(2, 1)
    assert link is device.link(1, 2) is device.links[1]
    assert (link.error, link.time_ns) == (6e-3, 50)
    assert (link.level2_error, link.level2_ns) == (None, None)
    assert device.link(0, 2) is None


def test_overrides_change_only_their_site_or_link() -> None:
    text = (
        TOY + "site_overrides:\n  1: {t1_us: 40, prep_error: 0.02}\n"
        "link_overrides:\n  3-2: {time_ns: 60.2}\nout_of_order: [3]\n"
    )
    usual, changed = read_device(TOY, "a"), read_device(text, "b")
    assert changed.sites[1].t1_us == 40.0
    assert changed.sites[1].prep_error == 0.02
    assert changed.sites[1].t2_us == 60.0
    assert (changed.sites[0], changed.sites[2]) == (usual.sites[0], usual.sites[2])
    assert changed.links[:2] == usual.links[:2]
    # Durations round up to whole nanoseconds.
    assert (changed.links[2].error, changed.links[2].time_ns) == (6e-3, 61)
    assert [site.in_service for site in changed.sites] == [True, True, True, False]
    assert changed.is_usable(changed.links[1])
    assert not changed.is_usable(changed.links[2])


def test_level2_is_where_the_file_offers_it() -> None:
    device = read_device(LEVEL2, "toy.yaml")
    expected = Level2(40.0, 3e-3, 35)
    assert [site.level2 for site in device.sites] == [expected, expected, None, None]
    # The gate needs level 2 at one end at least.
    assert [(link.level2_error, link.level2_ns) for link in device.links] == [
        (9e-3, 120),
        (9e-3, 120),
        (None, None),
    ]
    text = LEVEL2 + "site_overrides:\n  1: {level2: {t1_us: 33}}\n"
    assert read_device(text, "t").sites[1].level2 == Level2(33.0, 3e-3, 35)
    everywhere = read_device(LEVEL2.replace("[0, 1]", "all"), "t")
    assert all(site.level2 == expected for site in everywhere.sites)


def test_level2_can_be_switched_off() -> None:
    device = read_device(LEVEL2.replace("[0, 1]", "none"), "toy.yaml")
    assert all(site.level2 is None for site in device.sites)
    assert all(link.level2_error is None for link in device.links)


def test_no_decay_no_reset_no_feedback() -> None:
    text = (
        TOY.replace("t1_us: 80", "t1_us: none")
        .replace("t2_us: 60", "t2_us: none")
        .replace("  reset_error: 0.02\n  reset_time_ns: 500\n", "")
        .replace("reset: true", "reset: false")
        .replace("conditional_latency_ns: 400", "conditional_latency_ns: none")
    )
    device = read_device(text, "toy.yaml")
    assert (device.sites[0].t1_us, device.sites[0].t2_us) == (None, None)
    assert device.capabilities == Capabilities(
        mid_circuit_measurement=True, conditional_ns=None, reset=False
    )
    assert not device.capabilities.measured_cleanup


def test_twice_t1_is_the_last_t2_allowed() -> None:
    assert (
        read_device(TOY.replace("t2_us: 60", "t2_us: 160"), "t").sites[0].t2_us == 160
    )
    assert faults_of(TOY.replace("t2_us: 60", "t2_us: 160.001"))
    # The fault is where the last figure was set.
    text = TOY + "site_overrides:\n  2: {t1_us: 20}\n"
    assert faults_of(text)[0].startswith("toy.yaml:22:14: error[impossible-lifetime]")
    # A bad T1 is one fault, not two.
    assert len(faults_of(TOY.replace("t1_us: 80", "t1_us: -80"))) == 1


def test_t_gate_and_budget() -> None:
    device = read_device(
        TOY + "t_gate: {error: 2e-5, time_ns: 9000}\n"
        "budget: {share: 0.3, least_success: 0.1, most_sites: 3, longest_us: 7.0009}\n",
        "t",
    )
    assert device.t_gate == TGate(2e-5, 9000)
    # A limit rounds down.
    assert device.budget == Budget(0.3, 0.1, 3, 7000)
    part = read_device(TOY + "budget: {most_sites: 3}\n", "t").budget
    assert part == Budget(most_sites=3)


@pytest.mark.parametrize(
    ("words", "same"),
    [
        ("{kind: line, sites: 7}", lattices.line(7)),
        ("{kind: ring, sites: 7}", lattices.ring(7)),
        ("{kind: grid, rows: 3, columns: 4}", lattices.grid(3, 4)),
        ("{kind: hexagonal, rows: 3, columns: 4}", lattices.hexagonal(3, 4)),
        ("{kind: heavy-hex, rows: 3, row_length: 7}", lattices.heavy_hex(3, 7)),
        (
            "{kind: heavy-hex, rows: 2, row_length: 11, offset: 1, stubs: true}",
            lattices.heavy_hex(2, 11, offset=1, stubs=True),
        ),
        ("{kind: all-to-all, sites: 7}", lattices.all_to_all(7)),
        (
            "{kind: listed, sites: 3, links: [[2, 0], [1, 2]]}",
            lattices.listed(3, [(0, 2), (1, 2)]),
        ),
        (
            "{kind: listed, sites: 2, links: [[1, 0]], xy: [[0, 0], [0.5, -1]]}",
            lattices.listed(2, [(0, 1)], [(0.0, 0.0), (0.5, -1.0)]),
        ),
    ],
)
def test_every_lattice_can_be_written(words: str, same: lattices.Lattice) -> None:
    device = read_device(TOY.replace("{kind: line, sites: 4}", words), "t")
    assert tuple((link.a, link.b) for link in device.links) == same.links
    assert tuple(site.xy for site in device.sites) == same.xy
    assert device.lattice == same.words


def test_parts_are_allowed_when_said() -> None:
    text = TOY + "out_of_order: [1]\n"
    assert "fall into 2 parts" in faults_of(text)[0]
    assert read_device(text + "allow_disconnected: true\n", "t").sites[0].in_service


def test_all_faults_come_in_one_pass_sorted_by_place() -> None:
    text = (
        TOY.replace("t2_us: 60", "t2_us: 600")
        .replace("gate_error: 3e-4", "gate_error: 3")
        .replace("error: 6e-3", "eror: 6e-3")
        .replace("reset: true", "reset: on")
        + "out_of_order: [9]\nlink_overrides:\n  0-3: {error: 0.1}\nt_gate: 5\n"
    )
    found = faults_of(text)
    assert [line.split("]")[0] for line in found] == [
        "toy.yaml:9:10: error[impossible-lifetime",
        "toy.yaml:10:15: error[out-of-range",
        "toy.yaml:16:8: error[missing-key",
        "toy.yaml:16:9: error[unknown-key",
        "toy.yaml:20:10: error[wrong-type",
        "toy.yaml:21:16: error[unknown-site",
        "toy.yaml:23:3: error[unknown-link",
        "toy.yaml:24:9: error[wrong-type",
    ]


def test_there_are_enough_bad_files() -> None:
    assert len(BAD) >= 30


@pytest.mark.parametrize("path", BAD, ids=[path.stem for path in BAD])
def test_bad_file_is_refused_with_its_reason(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    first = text.splitlines()[0]
    assert first.startswith("# expect: ")
    expected = first.removeprefix("# expect: ")
    with pytest.raises(InputError) as caught:
        find_device(str(path))
    faults = caught.value.faults
    assert len(faults) == 1, "one fault a file"
    assert expected in str(faults[0])
    assert faults[0].place.line > 0
    assert faults[0].place.column > 0
    assert str(faults[0]).startswith(f"{path}:{faults[0].place.line}:")


# --- devices that travel along ---

SHIPPED = {
    # name: sites, links, measured cleanup
    "basalt-433": (433, 504, False),
    "breccia-27": (27, 28, True),
    "chert-27": (27, 28, False),
    "gneiss-127": (127, 144, True),
    "marl-32": (32, 496, True),
    "obsidian-36": (36, 60, True),
    "quartzite-20": (20, 31, True),
    "schist-1121": (1121, 1320, True),
    "shale-12": (12, 11, False),
    "slate-16": (16, 24, True),
    "tuff-10": (10, 10, True),
}


def test_shipped_devices_are_the_known_ones_sorted() -> None:
    assert shipped_devices() == tuple(SHIPPED)


@pytest.mark.parametrize("name", SHIPPED)
def test_shipped_device_reads_and_owns_up(name: str) -> None:
    device = find_device(name)
    assert device.name == device.path == name
    assert "invented" in device.note
    assert datetime.date.fromisoformat(device.calibrated)
    assert (
        len(device.sites),
        len(device.links),
        device.capabilities.measured_cleanup,
    ) == SHIPPED[name]
    # Every block of figures states where its range comes from.
    for block in device.text.split("\n\n"):
        lines = block.splitlines()
        figures = [line for line in lines if line.startswith(("sites:", "links:"))]
        if figures:
            assert any(line.startswith("#") for line in lines), block
    # The same file by its path is the same device.
    by_path = find_device(str(ROOT / "devices" / f"{name}.yaml"))
    assert (by_path.hash, by_path.sites, by_path.links) == (
        device.hash,
        device.sites,
        device.links,
    )


@pytest.mark.parametrize("name", ["shale-12", "tuff-10", "slate-16", "chert-27"])
def test_superconducting_figures_stay_inside_the_published_ranges(name: str) -> None:
    device = find_device(name)
    for site in device.sites:
        assert site.t1_us is not None
        assert site.t2_us is not None
        assert 20 <= site.t1_us <= 430
        assert 20 <= site.t2_us <= 430
        assert 1e-4 <= site.gate_error <= 1e-3
        assert 20 <= site.gate_ns <= 50
        assert 2.5e-3 <= site.readout_error <= 2e-2
    for link in device.links:
        assert 8e-4 <= link.error <= 1.3e-2
        assert 24 <= link.time_ns <= 60 or 300 <= link.time_ns <= 500


def test_unequal_sites_where_promised() -> None:
    for name in ("slate-16", "chert-27", "gneiss-127", "quartzite-20", "breccia-27"):
        device = find_device(name)
        assert len({site.t1_us for site in device.sites}) > 5
        assert len({link.error for link in device.links}) > 5


def test_characters_of_the_special_devices() -> None:
    ions = find_device("marl-32")
    assert all(site.t1_us is None for site in ions.sites)
    broken = find_device("breccia-27")
    assert [s.id for s in broken.sites if not s.in_service] == [8, 18, 25]
    trits = find_device("quartzite-20")
    assert sum(site.level2 is not None for site in trits.sites) == 16
    assert min(link.level2_error or 1 for link in trits.links) < 1e-2
    patches = find_device("obsidian-36")
    assert patches.t_gate is not None
    assert patches.t_gate.time_ns > 100 * patches.sites[0].readout_ns
    # The lifetimes state the error of one cycle: 1e-7 in 1.1 us.
    assert patches.sites[0].t1_us == patches.sites[0].t2_us
    rate = 3 / (4 * (patches.sites[0].t1_us or math.nan))
    assert rate * 1.1 == pytest.approx(1e-7)


# --- finding ---


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("slate16", "did you mean 'slate-16'?"),
        ("xyz", "shipped devices: basalt-433, breccia-27"),
        ("", "there is no device ''"),
        ("no/such.yaml", "cannot read 'no/such.yaml': no such file"),
        ("/", "cannot read '/': no such file"),
        ("a\0.yaml", "cannot read"),
        ("x" * 5000 + ".yaml", "cannot read"),
    ],
)
def test_device_that_cannot_be_found(name: str, expected: str) -> None:
    with pytest.raises(InputError) as caught:
        find_device(name)
    assert expected in str(caught.value)


def test_file_that_is_no_text(tmp_path: Path) -> None:
    path = tmp_path / "blob.yaml"
    path.write_bytes(b"name: \xff\xfe\n")
    with pytest.raises(InputError, match=r"not a text in UTF-8 \(byte 6\)"):
        find_device(str(path))


def test_own_file_may_have_any_name_and_line_ends(tmp_path: Path) -> None:
    path = tmp_path / "other.yml"
    path.write_bytes(TOY.replace("\n", "\r\n").encode())
    device = find_device(str(path))
    assert device.name == "toy-4"
    assert device.text.count("\r\n") == TOY.count("\n")


def test_shipped_device_must_be_called_like_its_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "other-4.yaml").write_text(TOY)
    monkeypatch.setattr("placer.device.read._shipped_folder", lambda: tmp_path)
    with pytest.raises(InputError, match="the device calls itself 'toy-4'"):
        find_device("other-4")


# --- nothing but InputError, whatever the text ---


def reads_or_refuses(text: str) -> None:
    """Fail on any error but an `InputError`, and on one that says nothing."""
    refusal = None
    try:
        read_device(text, "any.yaml")
    except InputError as error:
        refusal = error
    assert refusal is None or all(fault.what for fault in refusal.faults)
    assert refusal is None or refusal.faults


@given(st.text(max_size=200))
@example("\ufeff" + TOY)
@example('"\\UFFFFFFFF"')
@example("[" * 5000)
@example("&a [*a, *a]")
def test_random_text_is_read_or_refused(text: str) -> None:
    reads_or_refuses(text)


@settings(max_examples=150, deadline=None)
@given(st.data())
def test_spoilt_files_are_read_or_refused(data: st.DataObject) -> None:
    lines = (LEVEL2 + "site_overrides: {1: {t1_us: 50}}\nout_of_order: [3]\n").split(
        "\n"
    )
    for _ in range(data.draw(st.integers(1, 3))):
        spot = data.draw(st.integers(0, len(lines) - 1))
        line = lines[spot]
        cut = data.draw(st.integers(0, len(line)))
        junk = data.draw(
            st.sampled_from(["", "{", "[", "-1", "1e400", "none", ": ", "- ", "~", "'"])
            | st.text(max_size=5)
        )
        keep = data.draw(st.integers(cut, len(line)))
        lines[spot] = line[:cut] + junk + line[keep:]
    reads_or_refuses("\n".join(lines))
