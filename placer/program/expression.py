"""Values of constant expressions in postfix order, by the rules of each dialect.

Only compile-time values exist here.  A result that is no finite real number is a
fault at the place of the operator.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from placer.errors import InputError, Place, did_you_mean
from placer.program.syntax import Expression, Item, Number

Lookup = Callable[[str, Place], Number]
CONSTANTS: dict[str, float] = {
    "pi": math.pi,
    "π": math.pi,
    "tau": math.tau,
    "τ": math.tau,
    "euler": math.e,
    "ℇ": math.e,
}
_MOST_BITS = 2048  # of a whole number on the way

_FUNCTIONS: dict[str, tuple[int, Callable[..., Number]]] = {
    "sin": (1, math.sin),
    "cos": (1, math.cos),
    "tan": (1, math.tan),
    "exp": (1, math.exp),
    "sqrt": (1, math.sqrt),
    "ln": (1, math.log),
    "log": (1, math.log),
    "arcsin": (1, math.asin),
    "arccos": (1, math.acos),
    "arctan": (1, math.atan),
    "asin": (1, math.asin),
    "acos": (1, math.acos),
    "atan": (1, math.atan),
    "ceiling": (1, math.ceil),
    "floor": (1, math.floor),
    "float": (1, float),
    "angle": (1, float),
    "int": (1, int),
    "uint": (1, int),
}


def evaluate(expression: Expression, lookup: Lookup, dialect: str) -> Number:
    """Return the value of an expression; `lookup` gives the value of a name.

    Raises
    ------
    InputError
        At the place of the item that has no value.
    """
    if len(expression) == 1 and expression[0].kind == "number":
        return expression[0].value
    stack: list[Number] = []
    for item in expression:
        if item.kind == "number":
            stack.append(item.value)
        elif item.kind == "name":
            stack.append(_named(item, lookup))
        else:
            values = stack[len(stack) - item.arity :]
            del stack[len(stack) - item.arity :]
            stack.append(_checked(item, values, dialect))
    return stack[-1]


def _named(item: Item, lookup: Lookup) -> Number:
    if item.word in CONSTANTS:
        return CONSTANTS[item.word]
    return lookup(item.word, item.place)


def _checked(item: Item, values: Sequence[Number], dialect: str) -> Number:
    try:
        result = _apply(item, values, dialect)
    except (ZeroDivisionError, ValueError, OverflowError) as error:
        shown = ", ".join(f"{value:.12g}" for value in map(_short, values))
        raise InputError.at(
            item.place, "no-value", f"'{item.word}' has no value for {shown}"
        ) from error
    if not math.isfinite(_short(result)):
        raise InputError.at(
            item.place, "no-value", f"'{item.word}' gives no finite real number"
        )
    if isinstance(result, int) and result.bit_length() > _MOST_BITS:
        raise InputError.at(
            item.place, "no-value", f"'{item.word}' gives a number that is too large"
        )
    return result


def _short(value: Number) -> float:
    """Return a value as a float; whole numbers too large for one count as finite."""
    return float(value) if abs(value) < 1e300 or isinstance(value, float) else 1e300


def _apply(item: Item, values: Sequence[Number], dialect: str) -> Number:
    if item.kind == "unary":
        return _signed(item, values[0])
    if item.kind == "binary":
        return _binary(item, values[0], values[1], dialect)
    if item.word not in _FUNCTIONS:
        raise InputError.at(
            item.place,
            "unknown-function",
            f"'{item.word}' is no function of constants",
            did_you_mean(item.word, sorted(_FUNCTIONS)),
        )
    count, function = _FUNCTIONS[item.word]
    if len(values) != count:
        raise InputError.at(
            item.place,
            "argument-count",
            f"'{item.word}' takes {count} argument, found {len(values)}",
        )
    return function(*values)


def _signed(item: Item, value: Number) -> Number:
    if item.word == "-":
        return -value
    if item.word == "+":
        return value
    raise InputError.at(
        item.place, "unsupported", f"the operator '{item.word}' is not supported"
    )


def _binary(item: Item, left: Number, right: Number, dialect: str) -> Number:
    word = item.word
    if word == "+":
        return left + right
    if word == "-":
        return left - right
    if word == "*":
        return left * right
    if word == "/":
        return _quotient(item, left, right, dialect)
    if word == "**" or (word == "^" and dialect != "openqasm3"):
        return _power(left, right)
    if isinstance(left, int) and isinstance(right, int):
        return _on_whole(item, left, right)
    raise InputError.at(
        item.place,
        "unsupported",
        f"the operator '{word}' is not supported on these values",
        "a power is written '**' in OpenQASM 3" if word == "^" else "",
    )


def _quotient(item: Item, left: Number, right: Number, dialect: str) -> Number:
    if dialect == "openqasm3" and isinstance(left, int) and isinstance(right, int):
        if left % right == 0:
            return left // right
        # The specification truncates, its own library writes 1/2 and means a half.
        raise InputError.at(
            item.place,
            "ambiguous-division",
            f"{left}/{right} divides whole numbers and leaves a rest",
            f"write {left}.0/{right} for the fraction, or the whole number you mean",
        )
    return left / right


def _power(left: Number, right: Number) -> Number:
    if isinstance(left, int) and isinstance(right, int) and right >= 0:
        if abs(left) > 1 and right * left.bit_length() > _MOST_BITS:
            raise OverflowError
        return int(left**right)
    return math.pow(left, right)


def _on_whole(item: Item, left: int, right: int) -> int:
    word = item.word
    if word == "%":
        return int(math.fmod(left, right)) if abs(left) < 2**53 else left % right
    if word == "^":
        return left ^ right
    if word == "&":
        return left & right
    if word == "|":
        return left | right
    if word in ("<<", ">>"):
        if not 0 <= right <= _MOST_BITS:
            raise OverflowError
        return left << right if word == "<<" else left >> right
    raise InputError.at(
        item.place, "unsupported", f"the operator '{word}' is not supported"
    )
