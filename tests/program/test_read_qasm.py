"""OpenQASM constructs, one test each."""

from __future__ import annotations

import math

import pytest

from placer.errors import InputError
from placer.program.read import load_program, read_program

V2 = 'OPENQASM 2.0;\ninclude "qelib1.inc";\n'
V3 = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n'


def read(text, **options):
    return read_program(text, "p.qasm", **options)


def flat(program):
    """Return operations as text: name, wires, parameters, bit."""
    result = []
    for op in program.operations:
        text = " ".join([op.name, *(program.wire_names[w] for w in op.wires)])
        for value in op.params:
            text += f" {value:.6g}"
        result.append(text + (f" -> {op.bit}" if op.bit else ""))
    return result


def faults(text):
    with pytest.raises(InputError) as caught:
        read(text)
    return caught.value.faults


class TestVersions:
    @pytest.mark.parametrize(
        ("header", "syntax"),
        [
            ("OPENQASM 2.0;", "openqasm2"),
            ("// a\n/* b\n*/ OPENQASM 2.0;", "openqasm2"),
            ("OPENQASM 3;", "openqasm3"),
            ("OPENQASM 3.0;", "openqasm3"),
            ("OPENQASM 3.1;", "openqasm3"),
            ("// x\nOPENQASM 3.1;", "openqasm3"),
            ('include "qelib1.inc";', "openqasm2"),
            ("", "openqasm2"),
        ],
    )
    def test_header(self, header, syntax):
        assert read(f"{header}\nqreg q[1];\n").syntax == syntax

    def test_no_header_and_no_old_words_is_version_3(self):
        assert read("// qreg q[1];\nqubit q;\n").syntax == "openqasm3"

    def test_keywords_of_version_3_are_names_in_version_2(self):
        program = read(f"{V2}qreg in[1];\nqreg input[1];\ncx in[0],input[0];")
        assert flat(program) == ["cx in[0] input[0]"]

    def test_words_of_version_3_are_gates_in_version_2(self):
        text = "gate inv a { x a; }\nqreg q[1];\ninv q[0];\nqreg let[1];\ninv let[0];"
        assert flat(read(V2 + text)) == ["x q[0]", "x let[0]"]

    def test_carriage_returns_and_byte_order_mark(self):
        text = f"\ufeff{V2}qreg q[1];\nh q[0];\n".replace("\n", "\r\n")
        assert flat(read(text)) == ["h q[0]"]


class TestStartStates:
    def test_version_2_starts_in_zero(self):
        program = read(f"{V2}qreg q[2];\nh q;")
        assert program.registers[0].start == "zero"
        assert "every qubit starts in |0>" in program.assumed

    def test_version_3_starts_unknown(self):
        program = read(f"{V3}qubit[2] q;\nh q;")
        assert program.registers[0].start == "unknown"
        assert "may hold anything" in program.assumed

    def test_open_inputs(self):
        program = read(f"{V2}qreg q[2];\nh q;", open_inputs=True)
        assert program.registers[0].start == "unknown"
        assert program.open_inputs

    def test_open_inputs_leave_workspace_alone(self):
        text = (
            f"{V2}qreg q[2];\n//@placer.workspace init=zero ends=zero\n"
            "qreg w[1];\nccx q[0],q[1],w[0];\nccx q[0],q[1],w[0];"
        )
        program = read(text, open_inputs=True)
        assert [r.start for r in program.registers] == ["unknown", "zero"]

    def test_whole_reset_before_use_is_a_start_in_zero(self):
        program = read(f"{V3}qubit[2] a; qubit[2] b;\nbarrier;\nreset a;\ncx a, b;")
        assert [r.start for r in program.registers] == ["zero", "unknown"]
        assert flat(program)[1:] == ["cx a[0] b[0]", "cx a[1] b[1]"]
        assert "'a' start in |0>, since the program resets them" in program.assumed

    @pytest.mark.parametrize("text", ["reset a[0]; h a;", "h a; reset a;"])
    def test_other_resets_stay(self, text):
        program = read(f"{V3}qubit[2] a;\n{text}")
        assert program.registers[0].start == "unknown"
        assert "reset a[0]" in flat(program)

    def test_reset_stays_with_open_inputs(self):
        program = read(f"{V3}qubit a;\nreset a; h a;", open_inputs=True)
        assert flat(program) == ["reset a", "h a"]
        assert program.registers[0].start == "unknown"


class TestDeclarations:
    def test_registers(self):
        program = read(f"{V3}qubit a; qubit[2] b; qreg c[3]; qreg d; bit e; creg f[2];")
        shape = [(r.name, r.width, r.is_single, r.first) for r in program.registers]
        assert shape == [
            ("a", 1, True, 0),
            ("b", 2, False, 1),
            ("c", 3, False, 3),
            ("d", 1, True, 6),
        ]
        assert program.wire_names == ("a", "b[0]", "b[1]", "c[0]", "c[1]", "c[2]", "d")
        assert program.bits == (("e", 0), ("f", 2))
        assert program.register_of == (0, 1, 1, 2, 2, 2, 3)
        assert program.register_at(2).name == "b"

    def test_constants(self):
        text = (
            "const uint[8] n = 2 ** 3 - 6; const float f = pi / n;\n"
            "const int[8] m = -128; const angle g = tau / 4; const bool b = true;\n"
            "qubit[n] q; rz(f) q[n - 1]; rz(m * 0.5 + b) q[0]; rz(g) q[0];\n"
        )
        assert flat(read(V3 + text)) == [
            "rz q[1] 1.5708",
            "rz q[0] -63",
            "rz q[0] 1.5708",
        ]

    def test_aliases(self):
        text = (
            "qubit[5] q; qubit t;\nlet a = q[1:3]; let b = a[{2, 0}] ++ t;\n"
            "let c = q[-1]; let d = q[4:-2:0];\nx b; cx c, a[0]; h d;\n"
        )
        assert flat(read(V3 + text)) == [
            "x q[3]",
            "x q[1]",
            "x t",
            "cx q[4] q[1]",
            "h q[4]",
            "h q[2]",
            "h q[0]",
        ]

    def test_register_named_like_a_gate(self):
        assert flat(read(f"{V2}qreg t[1];\nt t[0];")) == ["t t[0]"]

    def test_included_file(self, tmp_path):
        (tmp_path / "sub").mkdir()
        (tmp_path / "sub" / "mine.inc").write_text("gate mine a { x a; rz(pi) a; }\n")
        main = tmp_path / "main.qasm"
        main.write_text(f'{V2}include "sub/mine.inc";\nqreg q[1];\nmine q[0];\n')
        program = load_program(main)
        assert flat(program) == ["x q[0]", "rz q[0] 3.14159"]
        (tmp_path / "sub" / "mine.inc").write_text("gate mine a { x a; }\n")
        assert load_program(main).hash != program.hash

    def test_fault_in_included_file_names_that_file(self, tmp_path):
        (tmp_path / "bad.inc").write_text("\ngate mine a { y b; }\n")
        main = tmp_path / "main.qasm"
        main.write_text('OPENQASM 3;\ninclude "stdgates.inc";\ninclude "bad.inc";\n')
        with pytest.raises(InputError) as caught:
            load_program(main)
        assert str(caught.value).startswith(f"{tmp_path / 'bad.inc'}:2:17: error")


class TestGates:
    def test_broadcast(self):
        program = read(
            f"{V2}qreg a[2];\nqreg b[2];\nqreg t[1];\ncx a,b;\nccx a,b,t[0];"
        )
        assert flat(program) == [
            "cx a[0] b[0]",
            "cx a[1] b[1]",
            "mcx a[0] b[0] t[0]",
            "mcx a[1] b[1] t[0]",
        ]
        assert [op.is_call for op in program.operations] == [False, False, True, True]

    def test_control_broadcast(self):
        program = read(f"{V3}qubit[2] a; qubit[2] b; ctrl @ h a, b;")
        assert flat(program) == ["ch a[0] b[0]", "ch a[1] b[1]"]

    def test_own_gates(self):
        text = (
            "gate inner(t) a { rz(t/2) a; barrier a; }\n"
            "gate empty a, b { }\n"
            "gate outer(x, y) a, b { inner(x+y) b; empty a,b; cx b,a; U(x,0,0) a; }\n"
            "qreg q[2];\nouter(1, 2^3) q[0],q[1];\n"
        )
        assert flat(read(V2 + text)) == ["rz q[1] 4.5", "cx q[1] q[0]", "u q[0] 1 0 0"]

    def test_own_gate_takes_the_place_of_a_newer_library_gate(self):
        text = (
            "gate rzz(t) a,b { cx a,b; u1(t) b; cx a,b; }\n"
            "qreg q[2];\nrzz(1) q[0],q[1];"
        )
        assert flat(read(V2 + text)) == ["cx q[0] q[1]", "p q[1] 1", "cx q[0] q[1]"]

    def test_library_gate_keeps_its_meaning_once_it_is_used(self):
        text = (
            "qreg q[2];\ngate g a,b { rzz(1) a,b; }\n"
            "gate rzz(t) a,b { cx a,b; u1(t) b; cx a,b; }\ng q[0],q[1];"
        )
        (fault,) = faults(V2 + text)
        assert (fault.code, fault.place.line) == ("declared-twice", 5)

    def test_loops_in_gates(self):
        text = (
            "gate g(t) a, b { for int i in [1:2] { rz(t * i) a; cx a, b; } }\n"
            "qubit[2] q; g(0.5) q[0], q[1];"
        )
        assert flat(read(V3 + text)) == [
            "rz q[0] 0.5",
            "cx q[0] q[1]",
            "rz q[0] 1",
            "cx q[0] q[1]",
        ]

    def test_parameters(self):
        text = (
            "qreg q[1];\nrz(-pi/2+sin(0)*3e-1) q[0];\nu2(.5,1.) q[0];\nu1(-2^2) q[0];"
        )
        assert flat(read(V2 + text)) == [
            "rz q[0] -1.5708",
            f"u q[0] {math.pi / 2:.6g} 0.5 1",
            "p q[0] -4",
        ]

    def test_negctrl_count_is_noted(self):
        program = read(f"{V3}qubit[3] q; negctrl(2) @ x q[0], q[1], q[2];")
        assert flat(program)[0] == "x q[1]" or flat(program)[0] == "x q[0]"
        assert "negctrl(2) was read as 2 nested negctrl" in program.assumed

    def test_reading_of_cu3_is_noted(self):
        program = read(f"{V2}qreg q[2];\ncu3(1,2,3) q[0],q[1];")
        assert program.assumed.count("cu3 was read as in newer versions") == 1

    def test_places_are_those_of_the_call(self):
        program = read(f"{V3}qubit[3] q;\n\n  cswap q[0], q[1], q[2];")
        assert {(op.place.line, op.place.column) for op in program.operations} == {
            (5, 3)
        }
        assert [op.index for op in program.operations] == [0, 1, 2]


class TestOtherStatements:
    def test_measurements(self):
        text = (
            "qubit[3] q; qubit t; bit[3] c; bit s;\nmeasure q -> c; s = measure t;\n"
            "c[0:1] = measure q[1:2]; measure t; bit[3] d = measure q;"
        )
        assert flat(read(V3 + text)) == [
            "measure q[0] -> c[0]",
            "measure q[1] -> c[1]",
            "measure q[2] -> c[2]",
            "measure t -> s",
            "measure q[1] -> c[0]",
            "measure q[2] -> c[1]",
            "measure t",
            "measure q[0] -> d[0]",
            "measure q[1] -> d[1]",
            "measure q[2] -> d[2]",
        ]

    def test_barriers(self):
        program = read(f"{V2}qreg q[2];\nqreg r[1];\nbarrier;\nbarrier r,q[0];")
        assert flat(program) == ["barrier q[0] q[1] r[0]", "barrier r[0] q[0]"]

    def test_loops(self):
        text = (
            "const int n = 3; qubit[n] q;\n"
            "for uint i in [0:n - 2] { cx q[i], q[i + 1]; }\n"
            "for int i in [n - 1:-2:0] h q[i];\nfor int i in {2, 0} { x q[i]; }\n"
            "for int i in [3:2] { y q[i]; }\n"
            "for int i in [0:1] { for int j in [0:i] { z q[i + j]; } }"
        )
        assert flat(read(V3 + text)) == [
            "cx q[0] q[1]",
            "cx q[1] q[2]",
            "h q[2]",
            "h q[0]",
            "x q[2]",
            "x q[0]",
            "z q[0]",
            "z q[1]",
            "z q[2]",
        ]

    def test_pragmas_and_foreign_annotations_are_kept(self):
        text = (
            "pragma other.tool on\nqubit q;\n@other.note a b\n@other.more\nx q;\ny q;"
        )
        program = read(V3 + text)
        assert program.kept == ("pragma other.tool on",)
        assert program.operations[0].annotations == ("@other.note a b", "@other.more")
        assert program.operations[1].annotations == ()

    def test_foreign_annotation_on_a_declaration_is_named(self):
        program = read(f"{V3}@other.note\nqubit q;\n")
        assert "'@other.note' in line 3 is not handed on" in program.assumed


class TestAnnotations:
    def test_version_3(self):
        text = (
            "qubit[2] a;\n@placer.keep\nqubit b;\n@placer.lendable\nqubit d;\n"
            "@placer.workspace init=zero ends=zero\nqubit w;\nreset w;\n"
            "ccx a[0], a[1], w;\ncx w, b;\nccx a[0], a[1], w;"
        )
        program = read(V3 + text)
        said = [(r.name, r.workspace, r.lendable, r.start) for r in program.registers]
        assert said == [
            ("a", False, True, "unknown"),
            ("b", False, False, "unknown"),
            ("d", False, True, "unknown"),
            ("w", True, True, "zero"),
        ]
        assert not [op for op in program.operations if op.kind == "reset"]

    @pytest.mark.parametrize("lead", ["//@", "// @", "//   @"])
    def test_version_2_comments(self, lead):
        text = (
            f"{V2}{lead}placer.keep\n// any words\nqreg a[1];\n// @other.x\nqreg b[1];"
        )
        assert [r.lendable for r in read(text).registers] == [False, True]

    def test_comment_in_version_3_is_none_and_the_program_says_so(self):
        program = read(f"{V3}// @placer.keep\nqubit a;\n")
        assert program.registers[0].lendable
        assert "the comment in line 3 is no annotation" in program.assumed


class TestFaults:
    def test_all_in_one_pass(self):
        found = faults(
            f"{V3}qubit[2] q;\nx r[0];\ncx q[0], q[0];\nwhile (true) {{ }}\n"
            "gate g a { y b; }\ng q[0];\nx q[7];\nx r[1];\n"
        )
        assert [(fault.place.line, fault.code) for fault in found] == [
            (4, "undeclared"),
            (5, "same-qubit"),
            (6, "unsupported"),
            (7, "undeclared"),
            (9, "index"),
        ]

    def test_syntax_faults_of_version_2_in_one_pass(self):
        found = faults(f"{V2}qreg q[2]\nx q[0];\nx q[0;\ngate g a {{ x a }}\ny q[1;\n")
        assert [fault.place.line for fault in found] == [4, 5, 6, 7]

    def test_refused_declarations_are_not_reported_again(self):
        found = faults(
            f"{V3}def f(qubit a) {{ x a; }}\ninput float t;\nqubit q;\nrz(t) q;\n"
        )
        assert [fault.place.line for fault in found] == [3, 4]

    def test_nested_definitions_cannot_run_away(self):
        text = "gate g0 a { x a; h a; }\n" + "".join(
            f"gate g{i} a {{ g{i - 1} a; g{i - 1} a; }}\n" for i in range(1, 40)
        )
        (fault,) = faults(f"{V2}{text}qreg q[1];\ng39 q[0];")
        assert fault.code == "too-large"

    def test_deep_definitions_are_refused(self):
        text = "gate g0(t) a { rz(t) a; }\n" + "".join(
            f"gate g{i}(t) a {{ g{i - 1}(t) a; }}\n" for i in range(1, 160)
        )
        (fault,) = faults(f"{V2}{text}qreg q[1];\n")
        assert fault.code == "too-deep"

    def test_long_sums_are_fine(self):
        text = "+".join(["0.001"] * 3000)
        assert flat(read(f"{V2}qreg q[1];\nrz({text}) q[0];")) == ["rz q[0] 3"]

    @pytest.mark.parametrize(
        "text",
        [
            "ctrl(100000000) @ x q;",
            "pow(100000000) @ u(1, 2, 3) q;",
            "pow(2 ** 1000) @ rz(1) q;",
            "gate g a { } pow(2 ** 100) @ g q;",
            "rz(10 ** 100000000) q;",
            "rz(1 << 100000000) q;",
            "rz(exp(1e9)) q;",
            "for int i in [0:999999] { for int j in [0:999999] { } }",
            "gate g a { for int i in [0:9999999999999] { x a; } } g q;",
        ],
    )
    def test_huge_numbers_end_soon(self, text):
        assert len(faults(f"{V3}qubit q;\n{text}")) == 1


class TestFiles:
    def test_missing(self, tmp_path):
        with pytest.raises(InputError, match="cannot be read: No such file"):
            load_program(tmp_path / "no.qasm")

    def test_folder(self, tmp_path):
        with pytest.raises(InputError, match="cannot be read"):
            load_program(tmp_path)

    @pytest.mark.parametrize("data", [b"\xff\xfe\x00", b"qreg q[1];\n\x80", b"a\x00b"])
    def test_no_text(self, tmp_path, data):
        path = tmp_path / "a.qasm"
        path.write_bytes(data)
        with pytest.raises(InputError, match="no text"):
            load_program(path)

    @pytest.mark.parametrize("name", ["a.qasm", "a.yaml"])
    @pytest.mark.parametrize("text", ["", " \n\t", "\ufeff"])
    def test_empty(self, name, text):
        with pytest.raises(InputError, match="is empty"):
            read_program(text, name)

    @pytest.mark.parametrize("text", ["// only a comment", "OPENQASM 3.0;", "/* */"])
    def test_nothing_in_it(self, text):
        with pytest.raises(InputError, match="declares no qubits"):
            read(text)

    def test_standard_input(self, monkeypatch):
        import io
        import sys
        from types import SimpleNamespace

        data = io.BytesIO(f"{V2}qreg q[1];\nh q;".encode())
        monkeypatch.setattr(sys, "stdin", SimpleNamespace(buffer=data))
        program = load_program("-")
        assert (program.name, program.path) == ("program", "-")

    def test_name_and_hash(self):
        text = f"{V2}qreg q[1];\nh q;"
        program = read_program(text, "folder/sum.qasm")
        assert program.name == "sum"
        assert program.text == text
        assert program.hash == read_program(text, "other.qasm").hash
        assert program.hash != read_program(text, "o.qasm", open_inputs=True).hash


def test_a_hundred_thousand_operations_read_quickly():
    import time

    body = "".join(
        f"cx q[{i % 49}],q[{i % 49 + 1}];\nrz(pi/{i % 64 + 1}) q[{i % 50}];\n"
        for i in range(50_000)
    )
    start = time.process_time()
    program = read(f"{V2}qreg q[50];\n{body}")
    assert len(program.operations) == 100_000
    # 5 s is the promise; twice that leaves room for a slow machine.
    assert time.process_time() - start < 10
