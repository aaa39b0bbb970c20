"""Small invented devices and programs, and plans for them made by hand."""

from __future__ import annotations

from functools import cache

from tests.check.handmade import make

SITES = """\
sites:
  t1_us: 80
  t2_us: 60
  gate_error: 3e-4
  gate_time_ns: 30
  readout_error: 0.01
  readout_time_ns: 300
  reset_error: 0.02
  reset_time_ns: 500
"""
ABLE = """\
capabilities:
  mid_circuit_measurement: true
  conditional_latency_ns: 400
  reset: true
"""
UNEQUAL = """\
site_overrides:
  1: {t1_us: 50, t2_us: 40, gate_error: 5e-4}
  3: {t1_us: 120, t2_us: 90, readout_error: 0.03}
link_overrides:
  0-1: {error: 9e-3, time_ns: 70}
  2-3: {error: 3e-3}
"""


def device(
    lattice: str, *, more: str = "", able: str = ABLE, sites: str = SITES
) -> str:
    return (
        f"name: marble\nnote: invented\ncalibrated: 2026-01-05\nlattice: {lattice}\n"
        f"{sites}links: {{error: 6e-3, time_ns: 50}}\n{able}{more}"
    )


LINE = device("{kind: line, sites: 8}", more=UNEQUAL)
RING = device("{kind: ring, sites: 6}", more=UNEQUAL)
GRID = device("{kind: grid, rows: 2, columns: 4}", more=UNEQUAL)
LEVEL2 = device(
    "{kind: grid, rows: 2, columns: 3}",
    more=UNEQUAL.replace("2-3", "1-2"),
    sites=SITES + "  level2: {t1_us: 40, error: 3e-3, time_ns: 35}\n",
    able=ABLE + "  level2_sites: [0, 1, 2, 4]\n",
).replace("time_ns: 50}", "time_ns: 50, level2: {error: 9e-3, time_ns: 120}}")

HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n'
CALLS = f"""{HEAD}qubit[4] a;
qubit b;
h a;
ctrl(4) @ x a[0], a[1], a[2], a[3], b;
cx b, a[0];
ctrl(3) @ z a[0], a[1], a[3], b;
"""
FULL = f"""{HEAD}qubit[4] a;
qubit[2] b;
ctrl(3) @ x a[0], a[1], a[2], b[1];
h a[3];
ctrl(4) @ x a[0], a[1], a[2], a[3], b[0];
"""
PLAIN = """OPENQASM 2.0;
include "qelib1.inc";
qreg a[3];
qreg b[2];
creg c[2];
h a;
ccx a[0],a[2],b[0];
t b[0];
barrier a,b;
reset a[2];
cu1(pi/4) a[2],b[1];
ch a[0],a[1];
swap a[1],b[1];
measure b -> c;
"""
SCOPE = """\
registers:
  a: {width: 3}
  b:
  z: {width: 1, start: zero}
steps:
  - h: a
  - scope:
      name: both
      workspace: {v: 2}
      compute:
        - and: {controls: [a.0, a.1], into: v.0}
        - and: {controls: [v.0, a.2], into: v.1}
      body:
        - cx: v.1, b
        - cx: v.1, z.0
  - cx: b, z.0
"""

SAMPLES: dict[str, tuple[str, str, str, tuple[str, ...]]] = {
    "clean": (CALLS, LINE, "calls.qasm", ("clean-ladder",)),
    "clean-half": (CALLS, GRID, "calls.qasm", ("clean-half", "clean-ladder")),
    "measured": (CALLS, GRID, "calls.qasm", ("clean-measured",)),
    "borrowed": (FULL, RING, "full.qasm", ("borrowed-one-halves", "borrowed-v-chain")),
    "free": (FULL, GRID, "full.qasm", ("borrowed-v-chain",)),
    "none": (CALLS, RING, "calls.qasm", ("none-gray",)),
    "level2": (CALLS, LEVEL2, "calls.qasm", ("level2-chain",)),
    "level2-tree": (FULL, LEVEL2, "full.qasm", ("level2-tree",)),
    "plain": (PLAIN, LINE, "plain.qasm", ()),
    "scope": (SCOPE, GRID, "scope.yaml", ("and-measured",)),
    "scope-mirror": (SCOPE, LINE, "scope.yaml", ("and-mirror",)),
}

PLACES = {"level2": [0, 1, 2, 4, 3], "level2-tree": [1, 0, 2, 4, 3, 5]}


@cache
def sample(name: str) -> str:
    """Return the JSON text of a plan made by hand."""
    program, where, path, recipes = SAMPLES[name]
    return make(program, where, name=path, recipes=recipes, sites=PLACES.get(name))
