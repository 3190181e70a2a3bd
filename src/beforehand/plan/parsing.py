"""From text to arithmetic: one tokenizer and one parser for limits and for derived columns.

A ``Grammar`` says which words and signs are allowed. A text becomes a frozen tree and nothing else: no
text of a plan is ever executed. Length and depth are bounded, so that a hostile text costs no more
than a long one.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from beforehand.faults import did_you_mean
from beforehand.plan.arithmetic import (
    COMPARISONS,
    PRODUCTS,
    SUMS,
    Call,
    Expression,
    Name,
    Negative,
    Number,
    Operation,
)

# Longer than any formula that a reviewer would read; bounds the work on a hostile text.
MOST_CHARACTERS = 1000

# Deeper than any formula that a reviewer would follow, and far from Python's own recursion limit.
MOST_DEPTH = 60

_TOKEN = re.compile(
    r"""(?P<space>\s+)
    |(?P<number>(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][-+]?\d+)?)
    |(?P<name>[^\W\d][\w.]*)
    |'(?P<quoted>(?:[^']|'')*)'
    |(?P<sign><=|>=|==|!=|[-+*/^()<>,])""",
    re.VERBOSE,
)


class FormulaError(ValueError):
    """The text is not a formula of the grammar; the message says why, without the text's place."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Grammar:
    """What a kind of formula may use.

    Attributes
    ----------
    functions : mapping of str to (int, int)
        Least and most number of operands of each function.
    names : tuple of str or None
        The symbols that may stand in it; None where any column may.
    powers, comparisons, quotes : bool
        Whether ``^``, comparisons and names in single quotes belong to it.
    """

    functions: Mapping[str, tuple[int, int]]
    names: tuple[str, ...] | None = None
    powers: bool = True
    comparisons: bool = True
    quotes: bool = True


@dataclass(frozen=True, slots=True)
class _Token:
    """A piece of the text with the character it starts at, from 1."""

    kind: str
    text: str
    at: int


def parse(text: str, grammar: Grammar) -> Expression:
    """Parse a formula.

    Parameters
    ----------
    text : str
        At most ``MOST_CHARACTERS`` long.
    grammar : Grammar

    Returns
    -------
    Expression
        At most ``MOST_DEPTH`` deep.

    Raises
    ------
    FormulaError
        When the text is not of the grammar.
    """
    if len(text) > MOST_CHARACTERS:
        raise FormulaError(f"is longer than {MOST_CHARACTERS} characters")
    if not text.strip():
        raise FormulaError("is empty")
    return _Parser(tuple(_tokens(text, grammar)), grammar).whole()


def _tokens(text: str, grammar: Grammar) -> Iterator[_Token]:
    """Cut the text; whatever is no token of the grammar is a fault."""
    at = 0
    while at < len(text):
        found = _TOKEN.match(text, at)
        if found is None or (found.lastgroup == "quoted" and not grammar.quotes):
            raise FormulaError(_stranger(text, at, grammar))
        kind = str(found.lastgroup)
        if kind == "quoted":
            name = str(found.group("quoted")).replace("''", "'")
            if not name:
                raise FormulaError(f"has an empty name in quotes at character {at + 1}")
            yield _Token("name in quotes", name, at + 1)
        elif kind != "space":
            yield _Token(kind, found.group(), at + 1)
        at = found.end()


def _stranger(text: str, at: int, grammar: Grammar) -> str:
    """What to say about a character that starts no token."""
    place = f"at character {at + 1}"
    if text[at] == "=":
        return f"has a single = {place}; a comparison is written =="
    if text[at] == "'" and grammar.quotes:
        return f"opens a quote {place} that is never closed"
    if text[at] in '"`' and grammar.quotes:
        return f"has {text[at]!r} {place}; a name with blanks or signs stands in 'single quotes'"
    return f"has {text[at]!r} {place}, which has no meaning here"


class _Parser:
    """Recursive descent over the tokens; ``depth`` counts open constructs."""

    def __init__(self, tokens: tuple[_Token, ...], grammar: Grammar) -> None:
        self._tokens = tokens
        self._grammar = grammar
        self._next = 0
        self._depth = 0

    def whole(self) -> Expression:
        """The whole text as one expression."""
        expression = self._comparison()
        if self._next < len(self._tokens):
            self._refuse(self._tokens[self._next])
        if _deeper_than(expression, MOST_DEPTH):
            raise FormulaError(_TOO_DEEP)
        return expression

    def _peek(self) -> str:
        """The sign that comes next; empty when it is no sign or the text is over."""
        if self._next == len(self._tokens):
            return ""
        token = self._tokens[self._next]
        return token.text if token.kind == "sign" else ""

    def _take(self) -> _Token:
        """The next token."""
        if self._next == len(self._tokens):
            raise FormulaError("ends where a number, a name or a bracket is expected")
        self._next += 1
        return self._tokens[self._next - 1]

    def _refuse(self, token: _Token) -> None:
        """Raise the fault of a token that cannot stand where it stands."""
        raise FormulaError(f"has {token.text!r} at character {token.at}, where it cannot stand")

    def _comparison(self) -> Expression:
        """``sum [sign sum]``; a second comparison would be ambiguous."""
        left = self._left_to_right(SUMS)
        if self._peek() not in COMPARISONS:
            return left
        token = self._take()
        if not self._grammar.comparisons:
            raise FormulaError(f"has a comparison at character {token.at}, which has no meaning here")
        right = self._left_to_right(SUMS)
        if self._peek() in COMPARISONS:
            again = self._take()
            raise FormulaError(
                f"has a second comparison at character {again.at}; put one of them in brackets"
            )
        return Operation(token.text, left, right)

    def _left_to_right(self, signs: tuple[str, ...]) -> Expression:
        """Operands joined by signs of one rank, from the left."""
        operand = self._signed if signs == PRODUCTS else lambda: self._left_to_right(PRODUCTS)
        left = operand()
        while self._peek() in signs:
            token = self._take()
            left = Operation(token.text, left, operand())
        return left

    def _signed(self) -> Expression:
        """``-`` and ``+`` before an operand."""
        sign = self._peek()
        if sign not in SUMS:
            return self._power()
        self._take()
        self._enter()
        operand = self._signed()
        self._depth -= 1
        return Negative(operand) if sign == "-" else operand

    def _power(self) -> Expression:
        """``atom [^ signed]``, so that -2^2 is -4 and 2^-1 is a half."""
        base = self._atom()
        if self._peek() != "^":
            return base
        token = self._take()
        if not self._grammar.powers:
            raise FormulaError(f"has ^ at character {token.at}, which has no meaning here")
        self._enter()
        exponent = self._signed()
        self._depth -= 1
        return Operation("^", base, exponent)

    def _atom(self) -> Expression:
        """A number, a name, a function or brackets."""
        token = self._take()
        if token.kind == "number":
            value = float(token.text)
            if value == float("inf"):
                raise FormulaError(f"has a number at character {token.at} that is too large")
            return Number(value)
        if token.kind == "name in quotes":
            return Name(token.text)
        if token.kind == "name":
            return self._call(token) if self._peek() == "(" else self._name(token)
        if token.text != "(":
            self._refuse(token)
        self._enter()
        inner = self._comparison()
        self._depth -= 1
        self._close()
        return inner

    def _name(self, token: _Token) -> Name:
        """A symbol or a column."""
        allowed = self._grammar.names
        if allowed is not None and token.text not in allowed:
            words = " and ".join(allowed)
            near = did_you_mean(token.text, (*allowed, *self._grammar.functions))
            raise FormulaError(f"has {token.text!r}, but only {words} have a meaning here{near}")
        return Name(token.text)

    def _call(self, token: _Token) -> Call:
        """A function with its operands in brackets."""
        functions = self._grammar.functions
        if token.text not in functions:
            known = ", ".join(functions)
            raise FormulaError(f"uses {token.text!r} as a function; there is only {known}")
        self._take()
        self._enter()
        arguments = [self._comparison()]
        while self._peek() == ",":
            self._take()
            arguments.append(self._comparison())
        self._depth -= 1
        self._close()
        least, most = functions[token.text]
        if not least <= len(arguments) <= most:
            wanted = f"{least}" if least == most else f"at least {least}"
            raise FormulaError(f"gives {token.text} {len(arguments)} operands; it takes {wanted}")
        return Call(token.text, tuple(arguments))

    def _close(self) -> None:
        """The closing bracket."""
        if self._peek() == ")":
            self._next += 1
        elif self._next == len(self._tokens):
            raise FormulaError("has a bracket that is never closed")
        else:
            self._refuse(self._tokens[self._next])

    def _enter(self) -> None:
        """Go one construct deeper."""
        self._depth += 1
        if self._depth > MOST_DEPTH:
            raise FormulaError(_TOO_DEEP)


_TOO_DEEP = f"is nested deeper than {MOST_DEPTH}"


def _deeper_than(expression: Expression, bound: int) -> bool:
    """Whether the tree is deeper than the bound, found without recursion."""
    level: list[Expression] = [expression]
    for _ in range(bound):
        below: list[Expression] = []
        for node in level:
            match node:
                case Negative(operand):
                    below.append(operand)
                case Operation(_, left, right):
                    below += [left, right]
                case Call(_, arguments):
                    below += arguments
        if not below:
            return False
        level = below
    return True
