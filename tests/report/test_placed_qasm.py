"""The placed text: accepted by the reference parser, same function as the source."""

from __future__ import annotations

import math
import random

import openqasm3
import pytest

from placer.errors import Place
from placer.problem import as_written
from placer.program.model import Operation, Program, Register, WireId
from placer.recipes import catalog
from placer.report.qasm import PlacedLease, PlacedStep, write_steps
from placer.report.qasmgates import RESERVED, free_name, gate_text, number
from tests.replay_reader import same_function

WIRES = ("a[0]", "a[1]", "a[2]", "a[3]", "t", "m[0]", "m[1]", "m[2]")


def program_of(
    operations: list[Operation],
    *,
    bits: tuple[tuple[str, int], ...] = (),
    kept: tuple[str, ...] = (),
    start: str = "unknown",
) -> Program:
    def register(name: str, width: int, first: int, single: bool) -> Register:
        return Register(
            name,
            width,
            single,
            start,  # type: ignore[arg-type]
            workspace=False,
            lendable=True,
            first=WireId(first),
            place=Place("x"),
        )

    return Program(
        name="small",
        syntax="openqasm3",
        registers=(
            register("a", 4, 0, single=False),
            register("t", 1, 4, single=True),
            register("m", 3, 5, single=False),
        ),
        wire_names=WIRES,
        operations=tuple(operations),
        scopes=(),
        bits=bits,
        kept=kept,
        assumed="every wire is unknown",
        open_inputs=True,
        text="",
        path="x.qasm",
        hash="0",
        register_of=(0, 0, 0, 0, 1, 2, 2, 2),
    )


def op(index: int, kind: str, name: str, wires: tuple[int, ...], **more) -> Operation:
    return Operation(
        index,
        kind,  # type: ignore[arg-type]
        name,
        tuple(WireId(w) for w in wires),
        place=Place("x.qasm", index + 3, 1),
        **more,
    )


SITES = {name: site for site, name in zip((7, 2, 9, 4, 1, 0, 5, 8), WIRES, strict=True)}
SOURCE = "OPENQASM 3.0; qubit[4] a; qubit t; qubit[3] m;\n"


def place_call(recipe: str, call: Operation) -> PlacedStep:
    angle = call.params[0] if call.params else 0.0
    built = catalog.build(recipe, call.kind, call.controls, angle, call.inverse)
    idle = [w for w in (5, 6, 7, 0, 1, 2, 3, 4) if w not in call.wires]
    free = [20, 21, 22, 23, 24, 25]
    leases = []
    for slot, kind in enumerate(built.slots):
        if kind == "clean":
            leases.append(PlacedLease(slot, free.pop(0), True, None))
        else:
            name = WIRES[idle.pop(0)]
            leases.append(PlacedLease(slot, SITES[name], False, name))
    return PlacedStep(call, built, 0, tuple(leases))


def accept(text: str) -> openqasm3.ast.Program:
    assert text.startswith("OPENQASM 3.0;\n")
    return openqasm3.parse(text)


def written(steps: list[PlacedStep], program: Program, fine: bool) -> str:
    return write_steps(steps, SITES, program, ["head"], is_fine=fine)


CALLS = [
    ("mcx", "ctrl({k}) @ x {wires};"),
    ("mcz", "ctrl({k}) @ z {wires};"),
    ("mcp", "ctrl({k}) @ p(0.7) {wires};"),
]


def every_case() -> list[tuple[str, str, int, str]]:
    return [
        (kind, recipe, controls, template)
        for kind, template in CALLS
        for controls in (2, 3, 4)
        for recipe in catalog.recipe_names(kind, controls, False)
    ]


@pytest.mark.parametrize("fine", [False, True], ids=["toffoli", "clifford-t"])
@pytest.mark.parametrize(("kind", "recipe", "controls", "template"), every_case())
def test_every_recipe_computes_the_call(kind, recipe, controls, template, fine):
    wires = (*range(controls), 4)
    params = (0.7,) if kind == "mcp" else ()
    call = op(0, kind, kind, wires, params=params)
    program = program_of([call])
    text = written([place_call(recipe, call)], program, fine)
    accept(text)
    assert "ccz " not in text
    source = SOURCE + template.format(
        k=controls, wires=", ".join(WIRES[w] for w in wires)
    )
    assert same_function(source, text, samples=3, seed=controls) == []


@pytest.mark.parametrize("fine", [False, True], ids=["toffoli", "clifford-t"])
@pytest.mark.parametrize("back", catalog.recipe_names("and", 3, True))
def test_a_product_is_made_and_taken_away(back, fine):
    make = op(0, "and", "and", (0, 1, 2, 4))
    use = op(1, "gate", "cx", (4, 3))
    drop = op(2, "and", "and", (0, 1, 2, 4), inverse=True)
    program = program_of([make, use, drop])
    steps = [
        place_call(catalog.recipe_names("and", 3, False)[0], make),
        PlacedStep(use, as_written(use), 1, ()),
        place_call(back, drop),
    ]
    text = written(steps, program, fine)
    accept(text)
    # The product's target is scratch of the source: it starts in |0>.
    text = text.replace("\n\n", "\nreset $1;\n\n", 1)
    source = SOURCE.replace("qubit t", "\n@placer.workspace\nqubit t") + (
        "ctrl(3) @ x a[0], a[1], a[2], t; cx t, a[3]; ctrl(3) @ x a[0], a[1], a[2], t;"
    )
    assert same_function(source, text, samples=4) == []
    if "measured" in back:
        assert "if (cleanup[" in text


def test_borrowed_step_is_marked_and_every_lender_returns():
    call = op(0, "mcx", "mcx", (0, 1, 2, 3, 4))
    names = catalog.recipe_names("mcx", 4, False)
    borrowed = next(
        n for n in names if "borrowed" in catalog.build(n, "mcx", 4, 0.0, False).slots
    )
    step = place_call(borrowed, call)
    text = written([step], program_of([call]), False)
    lenders = [x.lender for x in step.leases]
    assert lenders
    for name in lenders:
        assert text.count(f"@placer.borrow lender={name}\n") == 1
        assert text.count(f"@placer.return lender={name}\n") == 1
    assert text.index("@placer.borrow") < text.index("@placer.return")
    assert "reset" not in text.split("pragma placer.layout")[1]


def test_level2_call_stays_one_gate_at_both_levels():
    call = op(0, "mcx", "mcx", (0, 1, 2, 3, 4))
    names = catalog.recipe_names("mcx", 4, False)
    high = [n for n in names if catalog.build(n, "mcx", 4, 0.0, False).level2_wires]
    assert high
    step = place_call(high[0], call)
    for fine in (False, True):
        text = written([step], program_of([call]), fine)
        chosen = ",".join(f"${SITES[WIRES[w]]}" for w in step.built.level2_wires)
        assert (
            f"@placer.level2 sites={chosen}\nctrl(4) @ x $7, $2, $9, $4, $1;\n" in text
        )


PLAIN = [
    ("sxdg", (), "inv @ sx"),
    ("u", (0.1, -2.5, 1e-7), "U(0.1, -2.5, 1e-07)"),
    ("ry", (1 / 3,), "ry(0.3333333333333333)"),
    ("id", (), "id"),
    ("sdg", (), "sdg"),
]


@pytest.mark.parametrize(("name", "params", "spelled"), PLAIN)
def test_plain_gates_are_spelled_in_the_standard(name, params, spelled):
    gate = op(0, "gate", name, (2,), params=params)
    program = program_of([gate])
    for fine in (False, True):
        text = written([PlacedStep(gate, as_written(gate), 0, ())], program, fine)
        accept(text)
        if not fine:
            assert f"\n{spelled} $9;\n" in text
        source = SOURCE + f"{spelled} a[2];"
        assert same_function(source, text, samples=3) == []


@pytest.mark.parametrize("name", ["rzz", "rxx", "cp", "crx", "cry", "crz"])
def test_two_qubit_turns_keep_their_angle(name):
    gate = op(0, "gate", name, (1, 2), params=(0.3,))
    for fine in (False, True):
        text = written(
            [PlacedStep(gate, as_written(gate), 0, ())], program_of([gate]), fine
        )
        accept(text)
        assert same_function(SOURCE + f"{name}(0.3) a[1], a[2];", text, samples=3) == []


def test_bits_pragmas_barriers_and_resets():
    operations = [
        op(0, "gate", "h", (4,)),
        op(1, "barrier", "barrier", (0, 4)),
        op(2, "measure", "measure", (4,), bit="t"),
        op(3, "measure", "measure", (0,), bit="in[1]"),
    ]
    program = program_of(
        operations,
        bits=(("t", 0), ("in", 2)),
        kept=("vendor.note keep me",),
        start="zero",
    )
    steps = [PlacedStep(o, as_written(o), o.index, ()) for o in operations]
    text = written(steps, program, False)
    accept(text)
    assert "pragma vendor.note keep me\n" in text
    assert "pragma placer.renamed t=t_bits in=in_bits\n" in text
    assert "bit t_bits;\nbit[2] in_bits;\n" in text
    assert "barrier $7, $1;\nt_bits = measure $1;\nin_bits[1] = measure $7;\n" in text
    # Only the wires that some step uses are prepared.
    assert [x for x in text.splitlines() if x.startswith("reset")] == [
        "reset $1;",
        "reset $7;",
    ]
    source = (
        "OPENQASM 2.0; qreg a[4]; qreg t[1]; qreg m[3]; creg in[2]; creg t2[1];"
        "h t[0]; barrier a[0], t[0]; measure t[0] -> t2[0]; measure a[0] -> in[1];"
    )
    placed = text.replace("t=t_bits ", "t2=t_bits ").replace(" t=$1", " t[0]=$1")
    placed = placed.replace("bit t_bits", "bit[1] t_bits")
    placed = placed.replace("t_bits = ", "t_bits[0] = ")
    assert same_function(source, placed) == []


@pytest.mark.parametrize("value", [0.1, math.pi, -1e-300, 1e22, 5e-324, 3])
def test_numbers_read_back_the_same(value):
    text = gate_text("rz", (value,), [0])[0]
    assert float(text[3 : text.index(")")]) == value
    assert number(value) == repr(float(value))


def test_names_are_free_and_never_reserved():
    chance = random.Random(5)
    taken: set[str] = set()
    words = [*sorted(RESERVED), "c", "c", "9lives", "a-b", "", "öl"]
    chance.shuffle(words)
    made = [free_name(word, taken) for word in words]
    assert len(set(made)) == len(words)
    assert not set(made) & RESERVED
    openqasm3.parse("OPENQASM 3.0;\n" + "\n".join(f"bit {n};" for n in made))
