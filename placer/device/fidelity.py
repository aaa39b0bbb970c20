"""How much of a state survives waiting: decay formulas of idle sites.

Pure functions of a time and of lifetimes, all in microseconds; a lifetime of `None`
means that no decay is known.  Nothing here rounds, and nothing here knows a device.

Model: amplitude damping with separate jumps 1 -> 0 (rate 1/T1) and 2 -> 1 (rate
1/T1 of level 2), and pure dephasing by fluctuations of the level number, rate 1/Tphi
with 1/Tphi = 1/T2 - 1/(2 T1).  Nielsen and Chuang 2010, section 8.3, for two levels;
the three-level forms follow from the same jumps and are compared with a
master-equation solver in the tests.
"""

from __future__ import annotations

import math


def _rate(lifetime_us: float | None) -> float:
    return 0.0 if lifetime_us is None else 1.0 / lifetime_us


def _kept(time_us: float, lifetime_us: float | None) -> float:
    """Return exp(-t/T)."""
    return math.exp(-time_us * _rate(lifetime_us))


def dephasing_rate(t1_us: float | None, t2_us: float | None) -> float:
    """Return 1/Tphi = 1/T2 - 1/(2 T1) in 1/us.

    Raises
    ------
    ValueError
        If T2 > 2 T1, which no noise allows.
    """
    if t1_us is not None and (t2_us is None or t2_us > 2.0 * t1_us):
        raise ValueError(f"T2 {t2_us} us is more than twice T1 {t1_us} us")
    # At T2 = 2 T1 the difference may come out as -1e-19: that is no gain.
    return max(0.0, _rate(t2_us) - 0.5 * _rate(t1_us))


def process_fidelity(time_us: float, t1_us: float | None, t2_us: float | None) -> float:
    """Return the process fidelity of a qubit that waits: the worst it is charged.

    F = (1 + exp(-t/T1) + 2 exp(-t/T2)) / 4, the overlap with a kept entangled partner;
    it does not depend on the temperature.

    Examples
    --------
    >>> f"{process_fidelity(1.0, 100.0, 80.0):.8f}"
    '0.99130136'
    """
    return (1.0 + _kept(time_us, t1_us) + 2.0 * _kept(time_us, t2_us)) / 4.0


def average_fidelity(time_us: float, t1_us: float | None, t2_us: float | None) -> float:
    """Return the fidelity of a waiting qubit, averaged over all pure states."""
    return average_of_process(process_fidelity(time_us, t1_us, t2_us), 2)


def average_of_process(fidelity: float, levels: int) -> float:
    """Return (d F + 1) / (d + 1), the average fidelity of a process fidelity F."""
    return (levels * fidelity + 1.0) / (levels + 1.0)


def process_of_average(fidelity: float, levels: int) -> float:
    """Return ((d + 1) F - 1) / d, the process fidelity of an average fidelity F."""
    return ((levels + 1.0) * fidelity - 1.0) / levels


def ground_fidelity(
    time_us: float, t1_us: float | None, *, equilibrium: float = 0.0
) -> float:
    """Return the fidelity of a waiting |0>; `equilibrium` is the thermal weight of |1>.

    F = 1 - p_eq (1 - exp(-t/T1)).
    """
    return 1.0 - equilibrium * (1.0 - _kept(time_us, t1_us))


def excited_fidelity(
    time_us: float, t1_us: float | None, *, equilibrium: float = 0.0
) -> float:
    """Return the fidelity of a waiting |1>; `equilibrium` is the thermal weight of |1>.

    F = exp(-t/T1) + p_eq (1 - exp(-t/T1)).
    """
    kept = _kept(time_us, t1_us)
    return kept + equilibrium * (1.0 - kept)


def plus_fidelity(time_us: float, t2_us: float | None) -> float:
    """Return the fidelity of a waiting |+>, (1 + exp(-t/T2)) / 2."""
    return (1.0 + _kept(time_us, t2_us)) / 2.0


def value_fidelity(
    time_us: float, t1_us: float | None, t2_us: float | None, *, weight: float
) -> float:
    """Return the fidelity of a value whose weight p of |1> is known.

    F = (1-p)^2 + p^2 exp(-t/T1) + 2 p (1-p) exp(-t/T2) for a qubit that holds a
    function of the data and is entangled with them.  A product of j unknown bits has
    p = 2^-j.  p = 1/2 is the process fidelity, p = 0 a clean |0>.
    """
    empty = 1.0 - weight
    return (
        empty * empty
        + weight * weight * _kept(time_us, t1_us)
        + 2.0 * weight * empty * _kept(time_us, t2_us)
    )


def level2_process_fidelity(
    time_us: float,
    t1_us: float | None,
    level2_t1_us: float | None,
    dephasing_per_us: float,
) -> float:
    """Return the process fidelity of a qutrit that waits.

    With G1 = 1/T1, G2 = 1/T1 of level 2 and g = 1/Tphi:
    F = (1 + exp(-G1 t) + exp(-G2 t) + 2 (c01 + c12 + c02)) / 9, where the coherences
    keep c01 = exp(-(G1/2 + g) t), c12 = exp(-((G1 + G2)/2 + g) t) and
    c02 = exp(-(G2/2 + 4 g) t): levels two apart dephase four times as fast.

    Examples
    --------
    >>> f"{level2_process_fidelity(1.0, 100.0, 50.0, 0.0):.8f}"
    '0.99006633'
    """
    down1, down2 = _rate(t1_us), _rate(level2_t1_us)
    exponents = (
        (1.0, 0.0),
        (1.0, down1),
        (1.0, down2),
        (2.0, 0.5 * down1 + dephasing_per_us),
        (2.0, 0.5 * (down1 + down2) + dephasing_per_us),
        (2.0, 0.5 * down2 + 4.0 * dephasing_per_us),
    )
    return sum(share * math.exp(-rate * time_us) for share, rate in exponents) / 9.0


def level2_populations(
    time_us: float, t1_us: float | None, level2_t1_us: float | None
) -> tuple[float, float, float]:
    """Return where a waiting |2> is found: the weights of levels 0, 1 and 2."""
    down1, down2 = _rate(t1_us), _rate(level2_t1_us)
    stayed = math.exp(-down2 * time_us)
    # P1 = G2 (exp(-G2 t) - exp(-G1 t)) / (G1 - G2), written with expm1 so that equal
    # rates, where it is G2 t exp(-G t), lose no digits.
    gap = (down1 - down2) * time_us
    if abs(gap) < 1e-8:
        middle = down2 * time_us * stayed * (1.0 - 0.5 * gap)
    elif gap > 0.0:
        middle = -down2 * time_us * stayed * math.expm1(-gap) / gap
    else:
        middle = down2 * time_us * math.exp(-down1 * time_us) * math.expm1(gap) / gap
    return 1.0 - middle - stayed, middle, stayed


def decay_slope(t1_us: float | None, t2_us: float | None) -> float:
    """Return the slope of -ln F at t = 0 in 1/us: (1/T1 + 2/T2) / 4.

    -ln F of `process_fidelity` lies below this slope times t, since F is a sum of
    decaying exponentials with positive weights and its logarithm is convex.
    """
    return (_rate(t1_us) + 2.0 * _rate(t2_us)) / 4.0


def level2_decay_slope(
    t1_us: float | None, level2_t1_us: float | None, dephasing_per_us: float
) -> float:
    """Return the slope of -ln F of a waiting qutrit at t = 0, in 1/us.

    (3 (G1 + G2) + 12 g) / 9, with the rates of `level2_process_fidelity`.
    """
    down = _rate(t1_us) + _rate(level2_t1_us)
    return (3.0 * down + 12.0 * dephasing_per_us) / 9.0
