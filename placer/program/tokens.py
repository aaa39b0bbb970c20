"""Text to tokens, one at a time, each with its place; and expressions from tokens.

A token is matched only when it is asked for, so that a faster reader of simple
statements may move `position` by itself.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from typing import NamedTuple, NoReturn

from placer.errors import InputError, Place
from placer.program.syntax import Annotation, Expression, Item

DEEPEST_EXPRESSION = 100  # nested parentheses
LONGEST_NUMBER = 300  # characters

_TOKEN = re.compile(
    r"""
    (?P<space>[ \t\r\f\v\n\ufeff]+)
  | (?P<comment>//[^\n]*)
  | (?P<block>/\*.*?\*/)
  | (?P<number>(?:[0-9]+\.[0-9]*|\.[0-9]+|[0-9]+)(?:[eE][+-]?[0-9]+)?)
  | (?P<name>[^\W\d]\w*)
  | (?P<pin>\$[0-9]+)
  | (?P<text>"[^"\n]*")
  | (?P<symbol>->|\*\*|==|[\[\](){};,+\-*/^=])
    """,
    re.VERBOSE | re.DOTALL,
)
_OWN_WORDS = re.compile(r"//\s*@placer\b")
_STRENGTH = {"+": 1, "-": 1, "*": 2, "/": 2, "**": 4, "^": 4}
_SIGN_STRENGTH = 3


class Token(NamedTuple):
    """A piece of text: what it is, its letters, where it starts."""

    kind: str
    text: str
    offset: int


END = "end of text"


class Places:
    """Turns offsets of a text into places."""

    def __init__(self, text: str, file: str) -> None:
        self.file = file
        self.starts = [0]
        self.starts.extend(match.end() for match in re.finditer("\n", text))

    def at(self, offset: int) -> Place:
        """Return the place of an offset."""
        line = bisect_right(self.starts, offset)
        return Place(self.file, line, offset - self.starts[line - 1] + 1)


class Reader:
    """A position in a text, with one token of look-ahead.

    `notes` are annotations that wait for their statement, `gates` the gates that the
    text has declared so far.
    """

    def __init__(self, text: str, file: str) -> None:
        self.text = text
        self.places = Places(text, file)
        self.position = 0
        self.notes: list[Annotation] = []
        self.gates: set[str] = set()
        self._ahead: Token | None = None

    def peek(self) -> Token:
        """Return the next token without taking it."""
        if self._ahead is None:
            self._ahead = self._match()
        return self._ahead

    def take(self) -> Token:
        """Return the next token and move behind it."""
        token = self.peek()
        self._ahead = None
        self.position = token.offset + len(token.text)
        return token

    def jump(self, position: int) -> None:
        """Go on at another position of the text."""
        self.position = position
        self._ahead = None

    def place(self, token: Token) -> Place:
        """Return the place of a token."""
        return self.places.at(token.offset)

    def expect(self, text: str, where: str) -> Token:
        """Take a token that must be `text`."""
        token = self.take()
        if token.text != text or token.kind == "text":
            self.fail(token, f"expected '{text}' {where}, found {shown(token)}")
        return token

    def name(self, what: str) -> Token:
        """Take a token that must be an identifier."""
        token = self.take()
        if token.kind != "name":
            self.fail(token, f"expected {what}, found {shown(token)}")
        return token

    def accept(self, text: str) -> bool:
        """Take the next token if it is `text`."""
        token = self.peek()
        if token.text == text and token.kind != "text":
            self.take()
            return True
        return False

    def fail(
        self, token: Token, what: str, help: str = "", code: str = "syntax"
    ) -> NoReturn:
        """Refuse the text at a token."""
        raise InputError.at(self.place(token), code, what, help)

    def skip_statement(self, depth: int = 0) -> None:
        """Move behind the statement that a fault stands in, `depth` braces deep."""
        while True:
            token = self.peek_or_skip()
            if token.kind == "end":
                return
            self.take()
            if token.text == "{":
                depth += 1
            elif token.text == "}":
                depth -= 1
            if depth <= 0 and token.text in (";", "}"):
                return

    def peek_or_skip(self) -> Token:
        """Return the next token, stepping over letters that no token has."""
        while True:
            try:
                return self.peek()
            except InputError:
                self.position += 1

    def _match(self) -> Token:
        while self.position < len(self.text):
            match = _TOKEN.match(self.text, self.position)
            if match is None:
                letter = self.text[self.position]
                raise InputError.at(
                    self.places.at(self.position),
                    "bad-character",
                    f"the character {letter!r} does not belong here",
                )
            kind = match.lastgroup or ""
            if kind not in ("space", "comment", "block"):
                return Token(kind, match.group(), match.start())
            if kind == "comment" and _OWN_WORDS.match(match.group()):
                self._note(match.group(), match.start())
            self.position = match.end()
        return Token("end", "", len(self.text))

    def _note(self, comment: str, offset: int) -> None:
        """Keep a comment that holds an annotation for the statement that follows."""
        place = self.places.at(offset)
        start = self.places.starts[place.line - 1]
        if self.text[start:offset].strip():
            self.position = offset + len(comment)
            raise InputError.at(
                place,
                "annotation-place",
                "an annotation in a comment must stand alone on its line",
                "move it to the line before the statement it belongs to",
            )
        words = comment[2:].strip()[1:].split(maxsplit=1)
        rest = words[1] if len(words) > 1 else ""
        self.notes.append(Annotation(words[0], rest, place))


def shown(token: Token) -> str:
    """Return a token as a message repeats it."""
    if token.kind == "end":
        return "the end of the text"
    return repr(token.text if len(token.text) < 40 else token.text[:36] + "...")


def read_expression(reader: Reader, *, depth: int = 0) -> Expression:
    """Take an expression of numbers, names, + - * / ** ^, signs and functions."""
    items: list[Item] = []
    _sum(reader, items, 0, depth)
    return tuple(items)


def _sum(reader: Reader, items: list[Item], least: int, depth: int) -> None:
    """Take operands joined by operators that bind at least as strongly as `least`."""
    if depth > DEEPEST_EXPRESSION:
        reader.fail(
            reader.peek(), "the expression is nested too deeply", code="too-deep"
        )
    _operand(reader, items, depth)
    while True:
        token = reader.peek()
        strength = _STRENGTH.get(token.text, 0) if token.kind == "symbol" else 0
        if strength == 0 or strength < least:
            return
        reader.take()
        # Powers bind to the right, all else to the left.
        next_least = strength if strength == _STRENGTH["^"] else strength + 1
        _sum(reader, items, next_least, depth + 1)
        items.append(Item("binary", token.text, 0, 2, reader.place(token)))


def _operand(reader: Reader, items: list[Item], depth: int) -> None:
    token = reader.take()
    place = reader.place(token)
    if token.text in ("-", "+"):
        _sum(reader, items, _SIGN_STRENGTH, depth + 1)
        items.append(Item("unary", token.text, 0, 1, place))
    elif token.text == "(":
        _sum(reader, items, 0, depth + 1)
        reader.expect(")", "after the expression")
    elif token.kind == "number":
        items.append(Item("number", "", number(token, reader), 0, place))
    elif token.kind == "name" and reader.accept("("):
        _call(reader, items, token, depth)
    elif token.kind == "name":
        items.append(Item("name", token.text, 0, 0, place))
    else:
        reader.fail(token, f"expected a number or a name, found {shown(token)}")


def _call(reader: Reader, items: list[Item], token: Token, depth: int) -> None:
    count = 0
    if not reader.accept(")"):
        while True:
            _sum(reader, items, 0, depth + 1)
            count += 1
            if not reader.accept(","):
                break
        reader.expect(")", "after the arguments")
    items.append(Item("call", token.text, 0, count, reader.place(token)))


def number(token: Token, reader: Reader) -> int | float:
    """Return the value of a number token."""
    if len(token.text) > LONGEST_NUMBER:
        reader.fail(token, "the number has too many digits", code="bad-number")
    if token.text.isdigit():
        return int(token.text)
    return float(token.text)
