"""Decay formulas against master-equation runs, check values and their own shape."""

import math
import warnings

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from placer.device import fidelity

with warnings.catch_warnings():
    # The solver says on import that it cannot draw; drawing is not wanted.
    warnings.filterwarnings("ignore", "matplotlib not found")
    import qutip

TIGHT = {"atol": 1e-11, "rtol": 1e-10, "nsteps": 100_000}

# time, T1, T2 in us; `None` is no decay.
TWO_LEVEL_CASES = [
    (1.0, 100.0, 80.0),
    (20.0, 100.0, 150.0),
    (7.0, 100.0, 200.0),  # T2 = 2 T1, no pure dephasing
    (35.0, 60.0, 12.0),
    (250.0, 80.0, 50.0),  # long past the lifetimes
    (5.0, None, 40.0),
    (5.0, None, None),
]

# time, T1, T1 of level 2, Tphi in us.
THREE_LEVEL_CASES = [
    (1.0, 100.0, 50.0, None),  # harmonic ladder
    (30.0, 100.0, 50.0, None),
    (4.0, 84.0, 41.0, 120.0),
    (15.0, 60.0, 60.0, 35.0),  # equal rates
    (6.0, 40.0, None, 25.0),
    (6.0, None, 30.0, 25.0),
    (90.0, 50.0, 21.0, 70.0),
]


def jumps(
    levels: int,
    downs: list[float | None],
    dephasing_per_us: float,
    equilibrium: float = 0.0,
) -> list[qutip.Qobj]:
    """Return separate jump operators; `downs` are lifetimes of 1 -> 0, 2 -> 1, ..."""
    found = []
    for low, lifetime in enumerate(downs):
        if lifetime is None:
            continue
        fall = qutip.basis(levels, low) * qutip.basis(levels, low + 1).dag()
        found.append(math.sqrt((1 - equilibrium) / lifetime) * fall)
        if equilibrium:
            found.append(math.sqrt(equilibrium / lifetime) * fall.dag())
    if dephasing_per_us:
        found.append(math.sqrt(2.0 * dephasing_per_us) * qutip.num(levels))
    return found


def evolve(state: qutip.Qobj, time: float, ops: list[qutip.Qobj]) -> qutip.Qobj:
    if not ops:
        return qutip.ket2dm(state) if state.isket else state
    run = qutip.mesolve(
        0 * ops[0], state, [0.0, time], c_ops=ops, e_ops=[], options=TIGHT
    )
    return run.states[-1]


def fidelity_with_partner(
    amplitudes: list[float], time: float, ops: list[qutip.Qobj]
) -> float:
    """Return the fidelity of sum_i a_i |i>|i> when the second half waits."""
    levels = len(amplitudes)
    pair = sum(
        a * qutip.tensor(qutip.basis(levels, i), qutip.basis(levels, i))
        for i, a in enumerate(amplitudes)
    )
    half = [qutip.tensor(qutip.qeye(levels), op) for op in ops]
    return float(qutip.expect(evolve(pair, time, half), pair))


def even(levels: int) -> list[float]:
    return [1 / math.sqrt(levels)] * levels


@pytest.mark.parametrize(("time", "t1", "t2"), TWO_LEVEL_CASES)
@pytest.mark.parametrize("equilibrium", [0.0, 0.03])
def test_process_fidelity_agrees_with_the_solver(
    time: float, t1: float | None, t2: float | None, equilibrium: float
) -> None:
    ops = jumps(2, [t1], fidelity.dephasing_rate(t1, t2), equilibrium)
    solved = fidelity_with_partner(even(2), time, ops)
    assert fidelity.process_fidelity(time, t1, t2) == pytest.approx(solved, abs=1e-7)


@pytest.mark.parametrize(("time", "t1", "t2"), TWO_LEVEL_CASES)
def test_average_fidelity_agrees_with_six_states(
    time: float, t1: float | None, t2: float | None
) -> None:
    # The eigenstates of the three Pauli matrices are a 2-design: their mean is the
    # mean over all pure states.
    ops = jumps(2, [t1], fidelity.dephasing_rate(t1, t2))
    states = [
        vector
        for pauli in (qutip.sigmax(), qutip.sigmay(), qutip.sigmaz())
        for vector in pauli.eigenstates()[1]
    ]
    solved = np.mean([qutip.expect(evolve(s, time, ops), s) for s in states])
    assert fidelity.average_fidelity(time, t1, t2) == pytest.approx(solved, abs=1e-7)


@pytest.mark.parametrize("equilibrium", [0.0, 0.02, 0.3])
def test_single_states_agree_with_the_solver(equilibrium: float) -> None:
    time, t1, t2 = 30.0, 100.0, 90.0
    ops = jumps(2, [t1], fidelity.dephasing_rate(t1, t2), equilibrium)
    zero, one = qutip.basis(2, 0), qutip.basis(2, 1)
    plus = (zero + one).unit()

    def kept(state: qutip.Qobj) -> float:
        return float(qutip.expect(evolve(state, time, ops), state))

    assert fidelity.ground_fidelity(time, t1, equilibrium=equilibrium) == pytest.approx(
        kept(zero), abs=1e-7
    )
    assert fidelity.excited_fidelity(
        time, t1, equilibrium=equilibrium
    ) == pytest.approx(kept(one), abs=1e-7)
    assert fidelity.plus_fidelity(time, t2) == pytest.approx(kept(plus), abs=1e-7)


@pytest.mark.parametrize("weight", [0.0, 1 / 64, 1 / 8, 1 / 2, 0.9, 1.0])
@pytest.mark.parametrize(("time", "t1", "t2"), TWO_LEVEL_CASES[:4])
def test_value_fidelity_agrees_with_the_solver(
    time: float, t1: float | None, t2: float | None, weight: float
) -> None:
    ops = jumps(2, [t1], fidelity.dephasing_rate(t1, t2))
    solved = fidelity_with_partner(
        [math.sqrt(1 - weight), math.sqrt(weight)], time, ops
    )
    assert fidelity.value_fidelity(time, t1, t2, weight=weight) == pytest.approx(
        solved, abs=1e-7
    )


@pytest.mark.parametrize(("time", "t1", "level2_t1", "tphi"), THREE_LEVEL_CASES)
def test_level2_fidelity_agrees_with_the_solver(
    time: float, t1: float | None, level2_t1: float | None, tphi: float | None
) -> None:
    dephasing = 0.0 if tphi is None else 1.0 / tphi
    ops = jumps(3, [t1, level2_t1], dephasing)
    solved = fidelity_with_partner(even(3), time, ops)
    ours = fidelity.level2_process_fidelity(time, t1, level2_t1, dephasing)
    assert ours == pytest.approx(solved, abs=1e-7)


@pytest.mark.parametrize(
    ("time", "t1", "level2_t1"),
    [
        (12.0, 84.0, 41.0),
        (12.0, 41.0, 84.0),
        (12.0, 50.0, 50.0),
        (12.0, 50.0, 50.000001),
        (12.0, 50.0, 49.99999),
        (12.0, None, 30.0),
        (12.0, 30.0, None),
    ],
)
def test_level2_populations_agree_with_the_solver(
    time: float, t1: float | None, level2_t1: float | None
) -> None:
    end = evolve(qutip.basis(3, 2), time, jumps(3, [t1, level2_t1], 0.01))
    assert fidelity.level2_populations(time, t1, level2_t1) == pytest.approx(
        tuple(end.diag().real), abs=1e-7
    )


def test_check_values_of_two_levels() -> None:
    # Rebuilt independently with QuTiP 5.3.1.
    assert fidelity.process_fidelity(1, 100, 80) == pytest.approx(0.99130136, abs=5e-9)
    assert fidelity.average_fidelity(1, 100, 80) == pytest.approx(0.99420091, abs=5e-9)
    assert fidelity.process_fidelity(20, 100, 150) == pytest.approx(
        0.89226935, abs=5e-9
    )
    assert fidelity.average_fidelity(20, 100, 150) == pytest.approx(
        0.92817957, abs=5e-9
    )
    assert fidelity.ground_fidelity(30, 100, equilibrium=0.02) == pytest.approx(
        0.994816, abs=5e-7
    )
    assert fidelity.excited_fidelity(30, 100, equilibrium=0.02) == pytest.approx(
        0.746002, abs=5e-7
    )


@pytest.mark.parametrize(
    ("weight", "value"),
    # Rebuilt independently: T1 = 100, T2 = 80, t = 7.
    [(0, 1.0), (1 / 64, 0.997406), (1 / 8, 0.980617), (0.5, 0.941208), (1, 0.932394)],
)
def test_check_values_of_known_weight(weight: float, value: float) -> None:
    assert fidelity.value_fidelity(7, 100, 80, weight=weight) == pytest.approx(
        value, abs=5e-7
    )


@pytest.mark.parametrize(
    ("time", "process", "average"),
    # Rebuilt independently: harmonic ladder, T1 = 100, hence 50 for level 2.
    [(1, 0.99006633, 0.99254975), (30, 0.75199317, 0.81399488)],
)
def test_check_values_of_three_levels(
    time: float, process: float, average: float
) -> None:
    ours = fidelity.level2_process_fidelity(time, 100, 50, 0.0)
    assert ours == pytest.approx(process, abs=5e-9)
    assert fidelity.average_of_process(ours, 3) == pytest.approx(average, abs=5e-9)
    kept = math.exp(-time / 100)
    assert fidelity.level2_populations(time, 100, 50) == pytest.approx(
        ((1 - kept) ** 2, 2 * kept * (1 - kept), kept**2)
    )


def test_dephasing_beyond_twice_t1_is_refused() -> None:
    assert fidelity.dephasing_rate(50.0, 100.0) == 0.0
    assert fidelity.dephasing_rate(None, None) == 0.0
    assert fidelity.dephasing_rate(100.0, 80.0) == pytest.approx(1 / 80 - 1 / 200)
    for t2 in (100.1, None):
        with pytest.raises(ValueError, match="more than twice"):
            fidelity.dephasing_rate(50.0, t2)


lifetimes = st.none() | st.floats(0.1, 1e6)
times = st.floats(0.0, 1e4)


@st.composite
def sites(draw: st.DrawFn) -> tuple[float | None, float | None]:
    t1 = draw(lifetimes)
    t2 = draw(lifetimes) if t1 is None else draw(st.floats(0.05, 1.0)) * 2 * t1
    return t1, t2


@given(sites(), times, times, st.floats(0.0, 1.0))
def test_two_level_fidelities_fall_from_one_below_their_slope(
    site: tuple[float | None, float | None], a: float, b: float, weight: float
) -> None:
    early, late = sorted((a, b))
    for kept in (
        lambda t: fidelity.process_fidelity(t, *site),
        lambda t: fidelity.value_fidelity(t, *site, weight=weight),
        lambda t: fidelity.average_fidelity(t, *site),
    ):
        assert kept(0.0) == pytest.approx(1.0)
        assert 0.0 <= kept(late) <= kept(early) <= 1.0 + 1e-12
    cost = -math.log(fidelity.process_fidelity(late, *site))
    assert cost <= fidelity.decay_slope(*site) * late * (1 + 1e-9) + 1e-12


@given(lifetimes, lifetimes, st.floats(0.0, 10.0), times, times)
def test_three_level_fidelity_falls_from_one_below_its_slope(
    t1: float | None, level2_t1: float | None, dephasing: float, a: float, b: float
) -> None:
    def kept(time: float) -> float:
        return fidelity.level2_process_fidelity(time, t1, level2_t1, dephasing)

    early, late = sorted((a, b))
    assert kept(0.0) == pytest.approx(1.0)
    assert 1 / 9 - 1e-12 <= kept(late) <= kept(early) <= 1.0 + 1e-12
    slope = fidelity.level2_decay_slope(t1, level2_t1, dephasing)
    assert -math.log(kept(late)) <= slope * late * (1 + 1e-9) + 1e-12
    weights = fidelity.level2_populations(late, t1, level2_t1)
    assert sum(weights) == pytest.approx(1.0)
    assert all(-1e-9 <= weight <= 1.0 + 1e-9 for weight in weights)


@given(sites(), times, times)
def test_cost_of_waiting_is_concave(
    site: tuple[float | None, float | None], a: float, b: float
) -> None:
    def cost(time: float) -> float:
        return -math.log(fidelity.process_fidelity(time, *site))

    assert cost((a + b) / 2) >= (cost(a) + cost(b)) / 2 - 1e-12


@given(sites(), st.floats(0.0, 0.1))
def test_slope_is_the_first_order_of_the_cost(
    site: tuple[float | None, float | None], share: float
) -> None:
    slope = fidelity.decay_slope(*site)
    if slope == 0.0:
        assert fidelity.process_fidelity(1e6, *site) == 1.0
        return
    time = 1e-4 * share / slope
    cost = 1.0 - fidelity.process_fidelity(time, *site)
    assert cost == pytest.approx(slope * time, rel=1e-3, abs=1e-12)


@given(st.floats(0.0, 1.0), st.integers(2, 5))
def test_average_and_process_fidelity_convert_back(value: float, levels: int) -> None:
    average = fidelity.average_of_process(value, levels)
    assert fidelity.process_of_average(average, levels) == pytest.approx(value)


@given(sites(), times)
def test_half_weight_is_the_process_fidelity(
    site: tuple[float | None, float | None], time: float
) -> None:
    assert fidelity.value_fidelity(time, *site, weight=0.5) == pytest.approx(
        fidelity.process_fidelity(time, *site)
    )
