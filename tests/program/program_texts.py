"""Random programs: the text of a program, and the operations it must become.

Programs are legal by construction.  The expected operations are worked out beside the
text, without the reader.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from hypothesis import strategies as st

ONE = ["x", "y", "z", "h", "s", "sdg", "t", "tdg", "sx"]
ONE_ANGLE = ["rx", "ry", "rz"]
TWO = ["cx", "cy", "cz", "ch", "swap"]
INVERSE = {"s": "sdg", "sdg": "s", "t": "tdg", "tdg": "t", "sx": "sxdg"}


@dataclass
class Text:
    """A text and the operations expected of it: (name, wire names, params, bit)."""

    version: int
    lines: list[str] = field(default_factory=list)
    expected: list[tuple] = field(default_factory=list)
    kinds: set[str] = field(default_factory=set)

    @property
    def source(self) -> str:
        return "\n".join(self.lines) + "\n"


@st.composite
def programs(draw) -> Text:
    version = draw(st.sampled_from([2, 3]))
    text = Text(version)
    library = "qelib1" if version == 2 else "stdgates"
    text.lines += [f"OPENQASM {version}.0;", f'include "{library}.inc";']
    widths = draw(st.lists(st.integers(1, 4), min_size=2, max_size=3))
    wires = {}
    for number, width in enumerate(widths):
        name = f"r{number}"
        wires[name] = [f"{name}[{i}]" for i in range(width)]
        old = f"qreg {name}[{width}];"
        new = f"qubit[{width}] {name};"
        text.lines.append(old if version == 2 else new)
    text.lines.append("creg c[4];" if version == 2 else "bit[4] c;")
    makers = [_one, _angle, _two, _whole, _call, _measure, _barrier, _own]
    if version == 3:
        makers += [_controlled, _inverse, _loop]
    for number in range(draw(st.integers(1, 12))):
        maker = draw(st.sampled_from(makers))
        maker(draw, text, wires, number)
        text.kinds.add(maker.__name__)
    return text


def _some(draw, wires, count):
    """Draw different wires, as many as there are up to `count`."""
    every = [wire for register in wires.values() for wire in register]
    return draw(st.permutations(every))[:count]


def _value(draw):
    """Draw an angle: its text and its value."""
    top, bottom = draw(st.integers(1, 9)), draw(st.sampled_from([1, 2, 4, 8]))
    sign = draw(st.sampled_from(["", "-"]))
    value = (-1 if sign else 1) * top * 3.141592653589793 / bottom
    return f"{sign}{top}*pi/{bottom}", value


def _one(draw, text, wires, _):
    name, (wire,) = draw(st.sampled_from(ONE)), _some(draw, wires, 1)
    gap = draw(st.sampled_from([" ", "\n", "  // words\n ", "\t"]))
    text.lines.append(f"{name}{gap}{wire} ;")
    text.expected.append((name, (wire,), (), None))


def _angle(draw, text, wires, _):
    name, (wire,) = draw(st.sampled_from(ONE_ANGLE)), _some(draw, wires, 1)
    words, value = _value(draw)
    text.lines.append(f"{name}({words}) {wire};")
    text.expected.append((name, (wire,), (value,), None))


def _two(draw, text, wires, _):
    name, pair = draw(st.sampled_from(TWO)), _some(draw, wires, 2)
    text.lines.append(f"{name} {', '.join(pair)};")
    text.expected.append((name, tuple(pair), (), None))


def _whole(draw, text, wires, _):
    name = draw(st.sampled_from(sorted(wires)))
    text.lines.append(f"h {name};")
    text.expected += [("h", (wire,), (), None) for wire in wires[name]]


def _call(draw, text, wires, _):
    found = _some(draw, wires, 3)
    if len(found) == 3:
        text.lines.append(f"ccx {','.join(found)};")
        text.expected.append(("mcx", tuple(found), (), None))


def _measure(draw, text, wires, _):
    (wire,), bit = _some(draw, wires, 1), f"c[{draw(st.integers(0, 3))}]"
    arrow = text.version == 2 or draw(st.booleans())
    text.lines.append(
        f"measure {wire} -> {bit};" if arrow else f"{bit} = measure {wire};"
    )
    text.expected.append(("measure", (wire,), (), bit))


def _barrier(draw, text, wires, _):
    found = _some(draw, wires, draw(st.integers(0, 3)))
    text.lines.append(f"barrier {','.join(found)};")
    every = [wire for register in wires.values() for wire in register]
    text.expected.append(("barrier", tuple(found or every), (), None))


def _own(draw, text, wires, number):
    pair, (words, value) = _some(draw, wires, 2), _value(draw)
    name = f"g{number}"
    text.lines.append(
        f"gate {name}(v) a, b {{ rz(v/2) b; {draw(st.just('cx'))} b, a; }}"
    )
    text.lines.append(f"{name}({words}) {pair[0]}, {pair[1]};")
    text.expected += [
        ("rz", (pair[1],), (value / 2,), None),
        ("cx", (pair[1], pair[0]), (), None),
    ]


def _controlled(draw, text, wires, _):
    found = _some(draw, wires, draw(st.integers(3, 6)))
    if len(found) < 3:
        return
    name = draw(st.sampled_from(["x", "z"]))
    count = len(found) - 1
    modifiers = " ".join(["ctrl @"] * count)
    if draw(st.booleans()):
        modifiers = f"ctrl({count}) @"
    text.lines.append(f"{modifiers} {name} {', '.join(found)};")
    text.expected.append((f"mc{name}", tuple(found), (), None))


def _inverse(draw, text, wires, _):
    name, (wire,) = draw(st.sampled_from(ONE)), _some(draw, wires, 1)
    text.lines.append(f"inv @ {name} {wire};")
    text.expected.append((INVERSE.get(name, name), (wire,), (), None))


def _loop(draw, text, wires, _):
    name = draw(st.sampled_from(sorted(wires)))
    width = len(wires[name])
    text.lines.append(f"for int i in [{width - 1}:-1:0] {{ t {name}[i]; }}")
    text.expected += [("t", (wire,), (), None) for wire in reversed(wires[name])]
