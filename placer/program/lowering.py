"""Terms to operations: plain gates, and calls `mcx`, `mcz`, `mcp`.

The constructions are the textbook ones: A X B X C for a controlled one-qubit gate
(Barenco et al. 1995, arXiv:quant-ph/9503016, section 4), with shorter forms where a
conjugation does the work.  Global phase is dropped, relative phase is exact.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from functools import lru_cache
from typing import NamedTuple

from placer.program.model import OperationKind
from placer.program.terms import Term

PI = math.pi


class Raw(NamedTuple):
    """An operation on local wires: controls first, target last."""

    kind: OperationKind
    name: str
    wires: tuple[int, ...]
    params: tuple[float, ...] = ()


Controls = tuple[int, ...]
_PHASES = {"s": PI / 2, "sdg": -PI / 2, "t": PI / 4, "tdg": -PI / 4}
_UNDER_ONE = {"x": "cx", "y": "cy", "z": "cz", "h": "ch"}
_ROTATIONS_UNDER_ONE = {"rx": "crx", "ry": "cry", "rz": "crz"}


def lower(terms: Iterable[Term]) -> tuple[Raw, ...]:
    """Return the operations that do what terms do, up to a global phase."""
    result: list[Raw] = []
    for term in terms:
        wires = term.controls + term.targets
        result.extend(
            raw._replace(wires=tuple(wires[i] for i in raw.wires))
            for raw in _template(term.base, term.params, len(term.controls))
        )
    return tuple(result)


@lru_cache(maxsize=4096)
def _template(base: str, params: tuple[float, ...], count: int) -> tuple[Raw, ...]:
    """Return a base under `count` controls on local wires: controls, then targets."""
    controls = tuple(range(count))
    if base == "gphase":
        return tuple(_phase(params[0], controls))
    if base in ("swap", "rzz", "rxx"):
        return tuple(_on_two(base, params, controls, (count, count + 1)))
    return tuple(_on_one(base, params, controls, count))


def _gate(name: str, *wires: int, params: tuple[float, ...] = ()) -> Raw:
    return Raw("gate", name, wires, params)


def _flip(controls: Controls, target: int) -> Raw:
    """Return x, cx or mcx."""
    if len(controls) < 2:
        return _gate(("x", "cx")[len(controls)], *controls, target)
    return Raw("mcx", "mcx", (*controls, target))


def _sign(controls: Controls, target: int) -> Raw:
    """Return z, cz or mcz."""
    if len(controls) < 2:
        return _gate(("z", "cz")[len(controls)], *controls, target)
    return Raw("mcz", "mcz", (*controls, target))


def _phase(angle: float, wires: Sequence[int]) -> list[Raw]:
    """Return the phase `angle` where all wires are 1; nothing on no wires."""
    if not wires or angle == 0:
        return []
    if len(wires) < 3:
        return [_gate(("p", "cp")[len(wires) - 1], *wires, params=(angle,))]
    return [Raw("mcp", "mcp", tuple(wires), (angle,))]


def _on_one(
    base: str, params: tuple[float, ...], controls: Controls, target: int
) -> list[Raw]:
    if not controls:
        return [_gate(base, target, params=params)]
    if base == "id":
        return []
    if base == "p":
        return _phase(params[0], (*controls, target))
    if base in _PHASES:
        return _phase(_PHASES[base], (*controls, target))
    if base in ("x", "z"):
        return [(_flip if base == "x" else _sign)(controls, target)]
    if base in _UNDER_ONE and len(controls) == 1:
        return [_gate(_UNDER_ONE[base], *controls, target)]
    if base in _ROTATIONS_UNDER_ONE and len(controls) == 1:
        return [_gate(_ROTATIONS_UNDER_ONE[base], *controls, target, params=params)]
    return _UNDER_MANY[base](params, controls, target)


def _many_y(_: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
    """Y = S X S†."""
    return [_gate("sdg", target), _flip(controls, target), _gate("s", target)]


def _many_h(_: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
    """H = Ry(pi/4) Z Ry(-pi/4)."""
    return [
        _gate("ry", target, params=(-PI / 4,)),
        _sign(controls, target),
        _gate("ry", target, params=(PI / 4,)),
    ]


def _many_sx(_: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
    """Sqrt(X) = H S H."""
    return _root_of_x(PI / 2, controls, target)


def _many_sxdg(_: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
    """Sqrt(X)† = H S† H."""
    return _root_of_x(-PI / 2, controls, target)


def _root_of_x(angle: float, controls: Controls, target: int) -> list[Raw]:
    turn = _gate("h", target)
    return [turn, *_phase(angle, (*controls, target)), turn]


def _many_rotation(
    name: str, reflect: Callable[[Controls, int], Raw]
) -> Callable[[tuple[float, ...], Controls, int], list[Raw]]:
    """Return R(a) = R(a/2) F R(-a/2) F, for a reflection F with F R(a) F = R(-a)."""

    def build(params: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
        half = params[0] / 2
        mirror = reflect(controls, target)
        return [
            _gate(name, target, params=(half,)),
            mirror,
            _gate(name, target, params=(-half,)),
            mirror,
        ]

    return build


def _many_u(params: tuple[float, ...], controls: Controls, target: int) -> list[Raw]:
    """Write u = exp(i (phi+lam)/2) A X B X C with A B C = 1."""
    theta, phi, lam = params
    if theta == 0:
        return _phase(phi + lam, (*controls, target))
    if (theta, phi, lam) == (PI, 0.0, PI):
        return [_flip(controls, target)]
    flip = _flip(controls, target)
    return [
        *_turn("rz", (lam - phi) / 2, target),
        flip,
        *_turn("rz", -(phi + lam) / 2, target),
        *_turn("ry", -theta / 2, target),
        flip,
        *_turn("ry", theta / 2, target),
        *_turn("rz", phi, target),
        *_phase((phi + lam) / 2, controls),
    ]


def _turn(name: str, angle: float, target: int) -> list[Raw]:
    return [_gate(name, target, params=(angle,))] if angle else []


_UNDER_MANY: dict[str, Callable[[tuple[float, ...], Controls, int], list[Raw]]] = {
    "y": _many_y,
    "h": _many_h,
    "sx": _many_sx,
    "sxdg": _many_sxdg,
    "rx": _many_rotation("rx", _sign),
    "ry": _many_rotation("ry", _flip),
    "rz": _many_rotation("rz", _flip),
    "u": _many_u,
}


def _on_two(
    base: str,
    params: tuple[float, ...],
    controls: Controls,
    targets: tuple[int, int],
) -> list[Raw]:
    first, second = targets
    if not controls:
        return [_gate(base, first, second, params=params)]
    if base == "swap":
        frame = [_gate("cx", second, first)]
        return [*frame, _flip((*controls, first), second), *frame]
    frame = [_gate("cx", first, second)]
    core = [*frame, *_on_one("rz", params, controls, second), *frame]
    if base == "rzz":
        return core
    turns = [_gate("h", first), _gate("h", second)]
    return [*turns, *core, *turns]
