"""Plans for the tests of reports, made once for each run with little work."""

from __future__ import annotations

import json
from functools import cache
from typing import Any

from placer.api import plan
from placer.device.model import Budget
from placer.device.read import read_device
from placer.plan import to_json
from placer.program.read import read_program

BAD_NAME = "<script>alert(1)</script>"
# Names allow no brackets, so what is hostile is the path, a comment, a note.
BAD_PROGRAM = """OPENQASM 3.0;
include "stdgates.inc";
// </code></ol></script><script>alert(2)</script> & "quotes" 'too'
qubit[4] berth;
ctrl(3) @ x berth[0], berth[1], berth[2], berth[3];
"""
BAD_DEVICE = """name: tuff-4
note: "</style><img src=x onerror=alert(3)>"
calibrated: 2026-02-19
lattice: {kind: ring, sites: 6}
sites: {t1_us: 60, t2_us: 55, gate_error: 5e-4, gate_time_ns: 25, readout_error: 8e-3,
  readout_time_ns: 200, reset_error: 6e-3, reset_time_ns: 700}
links: {error: 5e-3, time_ns: 40}
capabilities: {mid_circuit_measurement: true, conditional_latency_ns: 450, reset: true,
  level2_sites: none}
"""


@cache
def plan_data(name: str) -> dict[str, Any]:
    """Return the data of a sample: `small`, `lent`, `level2`, `failing`, `hostile`."""
    if name == "small":
        made = plan("tide-gate", "slate-16", effort="quick")
    elif name == "lent":
        made = plan("full-berths", "tuff-10", effort="quick")
    elif name == "level2":
        made = plan("deep-channel", "quartzite-20", effort="quick")
    elif name == "measured":
        made = plan("pilot-book", "tuff-10", effort="quick")
    elif name == "failing":
        made = plan(
            "tide-gate", "slate-16", effort="quick", budget=Budget(0.01, 0.9, 6, 900)
        )
    else:
        program = read_program(BAD_PROGRAM, f"{BAD_NAME}.qasm")
        device = read_device(BAD_DEVICE, f"{BAD_NAME}.yaml")
        made = plan(program, device, effort="quick")
    data: dict[str, Any] = json.loads(to_json(made))
    return data


NAMES = ("small", "lent", "level2", "measured", "failing", "hostile")
