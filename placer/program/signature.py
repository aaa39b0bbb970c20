"""Signatures: what an arithmetic call is asked for, its wires, and its meaning.

A signature is kind, widths and options.  `layout` says which wire is which, `apply`
what the call does to integers, written from the definition of its kind alone.  How a
call is built is not known here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

Values = tuple[int, ...]
"""One integer a control, then one a register, then one for the result wire."""

ARITHMETIC_KINDS: tuple[str, ...] = (
    "add",
    "subtract",
    "sum",
    "add_constant",
    "less_than",
    "equal",
    "increment",
    "decrement",
    "lookup",
    "multiply_add",
)

_WITH_CARRY = frozenset({"add", "subtract", "sum", "add_constant"}) | frozenset(
    {"increment", "decrement"}
)
_WITH_RESULT = frozenset({"less_than", "equal"})
_BY_CONSTANT = frozenset({"add_constant", "less_than", "equal"})


@dataclass(frozen=True, slots=True)
class Signature:
    """What an arithmetic call computes, as far as recipes need to know.

    Operand wires come in this order: the controls, the registers (little-endian), then
    the result wire or the carry wire, if there is one.  Everything happens only if all
    controls are 1.  All arithmetic is modulo 2^n, n being the width of the target.

    ================ ============ =====================================================
    kind             registers    meaning
    ================ ============ =====================================================
    add              A, B (n, n)  B += A; the carry wire ^= carry
    subtract         A, B (n, n)  B -= A; the carry wire ^= [B < A], before
    sum              A, B, S      S, promised to be 0, becomes A + B; the carry wire,
                                  promised to be 0, becomes the carry; the inverse
                                  promises the sum and leaves 0
    add_constant     B (n)        B += constant; the carry wire ^= carry
    less_than        A, B (n, n)  result ^= [A < B]
    less_than        A (n)        with a constant: result ^= [A < constant]
    equal            A, B or A    result ^= [A = B] or [A = constant]
    increment        B (n)        B += 1; the carry wire ^= carry
    decrement        B (n)        B -= 1; the carry wire ^= [B = 0], before
    lookup           X, Y (m, b)  Y ^= table[X]; X is promised to be below the length
                                  of the table; the inverse promises Y = table[X]
    multiply_add     A, B, T      T += A B, any widths
    ================ ============ =====================================================

    `inverse` asks for the inverse function.  `carry` asks for the carry wire, where
    the kind may have one.
    """

    kind: str
    widths: tuple[int, ...]
    controls: int = 0
    constant: int | None = None
    table: tuple[int, ...] = ()
    carry: bool = False
    inverse: bool = False

    @property
    def width(self) -> int:
        """Width of the register that decides the size of the call.

        The target of an addition, the compared register, the address of a look-up.
        """
        if self.kind == "multiply_add":
            return self.widths[2]
        return self.widths[0]

    @property
    def has_result(self) -> bool:
        """Whether a single wire follows the registers."""
        return self.carry or self.kind in _WITH_RESULT

    @property
    def operands(self) -> int:
        """Number of operand wires."""
        return self.controls + sum(self.widths) + self.has_result

    @property
    def is_backward(self) -> bool:
        """Whether an addition is run as a subtraction."""
        return self.inverse != (self.kind in ("subtract", "decrement"))


@dataclass(frozen=True, slots=True)
class Layout:
    """Which local wire is which: controls, registers, result wire, first slot."""

    controls: tuple[int, ...]
    registers: tuple[tuple[int, ...], ...]
    result: int | None
    first_slot: int

    @property
    def target(self) -> tuple[int, ...]:
        """The last register with the carry wire on top, as one register."""
        top = () if self.result is None else (self.result,)
        return self.registers[-1] + top


def layout(signature: Signature) -> Layout:
    """Return the operand wires of a call.

    Examples
    --------
    >>> layout(Signature("add", (2, 2), controls=1)).registers
    ((1, 2), (3, 4))
    """
    at = signature.controls
    registers: list[tuple[int, ...]] = []
    for width in signature.widths:
        registers.append(tuple(range(at, at + width)))
        at += width
    result = at if signature.has_result else None
    controls = tuple(range(signature.controls))
    return Layout(controls, tuple(registers), result, signature.operands)


def changed(signature: Signature) -> tuple[int, ...]:
    """Return the operand wires that a call may change; the others it only reads."""
    wires = layout(signature)
    if signature.kind in _WITH_RESULT:
        return () if wires.result is None else (wires.result,)
    return wires.target


def value_widths(signature: Signature) -> tuple[int, ...]:
    """Return the width of each integer in `Values`."""
    result = (1,) if signature.has_result else ()
    return (1,) * signature.controls + signature.widths + result


def problems(signature: Signature) -> tuple[str, ...]:
    """Return what is wrong with a signature, in words; nothing if it has a meaning.

    Examples
    --------
    >>> problems(Signature("add", (3, 2)))
    ('add needs two registers of one width, not (3, 2)',)
    """
    kind, widths = signature.kind, signature.widths
    if kind not in ARITHMETIC_KINDS:
        return (f"there is no arithmetic kind {kind!r}",)
    found: list[str] = []
    if signature.controls < 0 or any(width < 1 for width in widths):
        found.append("controls and widths must not be negative or empty")
    found += _shape_problems(signature)
    if signature.carry and kind not in _WITH_CARRY:
        found.append(f"{kind} has no carry")
    if kind == "lookup":
        found += _table_problems(signature)
    elif signature.table:
        found.append(f"{kind} takes no table")
    if not found and signature.constant is not None:
        most = 1 << widths[0]
        top = most if kind == "less_than" else most - 1
        if not 0 <= signature.constant <= top:
            found.append(f"constant {signature.constant} is not in 0..{top}")
    return tuple(found)


def _shape_problems(signature: Signature) -> list[str]:
    kind, widths = signature.kind, signature.widths
    constant = signature.constant is not None
    if constant and kind not in _BY_CONSTANT:
        return [f"{kind} takes no constant"]
    if kind == "add_constant" and not constant:
        return ["add_constant needs a constant"]
    if kind in ("lookup", "multiply_add"):
        wanted = 2 if kind == "lookup" else 3
        fits, words = len(widths) == wanted, f"{wanted} registers"
    elif kind in ("add_constant", "increment", "decrement") or constant:
        fits, words = len(widths) == 1, "one register"
    else:
        wanted = 3 if kind == "sum" else 2
        fits = len(widths) == wanted and len(set(widths)) == 1
        words = f"{'three' if wanted == 3 else 'two'} registers of one width"
    return [] if fits else [f"{kind} needs {words}, not {widths}"]


def _table_problems(signature: Signature) -> list[str]:
    if len(signature.widths) != 2:
        return []
    address, output = signature.widths
    size = len(signature.table)
    if not 1 <= size <= 1 << address:
        return [f"a table of {size} entries does not fit {address} address wires"]
    worst = max(signature.table)
    if min(signature.table) < 0 or worst >> output:
        return [f"the table holds numbers that do not fit {output} wires"]
    return []


# ------------------------------------------------------------------ meaning
def numbers(bits: Sequence[int], widths: Sequence[int]) -> Values:
    """Return the integers that little-endian bits hold."""
    values = []
    at = 0
    for width in widths:
        values.append(sum(bits[at + i] << i for i in range(width)))
        at += width
    return tuple(values)


def digits(values: Sequence[int], widths: Sequence[int]) -> list[int]:
    """Return the bits of integers, little-endian, one after the other."""
    return [
        value >> place & 1
        for value, width in zip(values, widths, strict=True)
        for place in range(width)
    ]


def promised(signature: Signature, values: Values) -> bool:
    """Whether the values keep the promises of the kind (always, for most kinds)."""
    registers = values[signature.controls :]
    active = all(values[: signature.controls])
    if signature.kind == "sum":
        first, second, total = registers[:3]
        carry = registers[3] if signature.carry else 0
        whole = (first + second) * (active and signature.inverse)
        size = signature.width
        return total == whole % (1 << size) and (
            not signature.carry or carry == whole >> size
        )
    if signature.kind == "lookup":
        address, output = registers
        if address >= len(signature.table):
            return False
        held = signature.table[address] if active else 0
        return output == held or not signature.inverse
    return True


def apply(signature: Signature, values: Values) -> Values:
    """Return what a call makes of integers: the definition of its kind.

    Examples
    --------
    >>> apply(Signature("add", (3, 3), carry=True), (5, 6, 0))
    (5, 3, 1)
    """
    at = signature.controls
    if not all(values[:at]):
        return values
    registers = values[at:]
    after = _RULES[signature.kind](signature, registers)
    return values[:at] + after


def _shifted(signature: Signature, registers: Values, amount: int) -> Values:
    """Return the last register and the carry wire, as one number, moved by an amount.

    The carry wire is the top bit of that number, so that carry and borrow flip it.
    """
    size = signature.widths[-1]
    rest, old = registers[: len(signature.widths) - 1], registers[-1]
    if signature.carry:
        old = registers[-2] + (registers[-1] << size)
    step = -amount if signature.is_backward else amount
    new = (old + step) % (1 << (size + signature.carry))
    result = (new >> size,) if signature.carry else ()
    return (*rest, new % (1 << size), *result)


def _add(signature: Signature, registers: Values) -> Values:
    return _shifted(signature, registers, registers[0])


def _sum(signature: Signature, registers: Values) -> Values:
    whole = 0 if signature.inverse else registers[0] + registers[1]
    size = signature.width
    carry = (whole >> size,) if signature.carry else ()
    return (*registers[:2], whole % (1 << size), *carry)


def _add_constant(signature: Signature, registers: Values) -> Values:
    return _shifted(signature, registers, signature.constant or 0)


def _step(signature: Signature, registers: Values) -> Values:
    return _shifted(signature, registers, 1)


def _compare(signature: Signature, registers: Values) -> Values:
    first = registers[0]
    other = registers[1] if signature.constant is None else signature.constant
    holds = first < other if signature.kind == "less_than" else first == other
    return (*registers[:-1], registers[-1] ^ int(holds))


def _lookup(signature: Signature, registers: Values) -> Values:
    address, output = registers
    return (address, output ^ signature.table[address])


def _multiply_add(signature: Signature, registers: Values) -> Values:
    return _shifted(signature, registers, registers[0] * registers[1])


_RULES = {
    "add": _add,
    "subtract": _add,
    "sum": _sum,
    "add_constant": _add_constant,
    "less_than": _compare,
    "equal": _compare,
    "increment": _step,
    "decrement": _step,
    "lookup": _lookup,
    "multiply_add": _multiply_add,
}
