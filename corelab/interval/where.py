"""The small language of `--where`: comparisons of columns, joined by and, or, not, with brackets.

    expression := conjunction { "or" conjunction }
    conjunction := negation { "and" negation }
    negation := "not" negation | "(" expression ")" | comparison
    comparison := column operator value | column "contains" text | column "is" ["not"] "empty"
    operator := = | != | <> | < | <= | > | >=

Columns are named without their units; a name of several words needs no quotes. Texts stand in single or
double quotes; the quote itself is doubled in them, or follows a backslash. An empty value satisfies nothing
but `is empty`. The text is parsed into a tree and applied to columns; nothing in it is ever evaluated as
code.
"""

from __future__ import annotations

import operator
import re
import unicodedata
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from corelab.errors import Usage, did_you_mean, quoted

Mask = NDArray[np.bool_]

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_TOKEN = re.compile(
    rf"""\s*(?:
        (?P<text>'(?:[^'\\]|\\.|'')*'|"(?:[^"\\]|\\.|"")*")
      | (?P<number>{_NUMBER}(?=[\s()<>=!]|$))
      | (?P<operator><=|>=|<>|!=|==|=|<|>)
      | (?P<bracket>[()])
      | (?P<word>[^\s()<>=!'"‘’“”]+)
    )""",
    re.VERBOSE | re.DOTALL,
)
_COMPARE: dict[str, Callable[[Any, Any], Any]] = {
    "=": operator.eq,
    "==": operator.eq,
    "!=": operator.ne,
    "<>": operator.ne,
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
}
_WORDS = {"and", "or", "not", "contains", "is", "empty"}
_MOST_CHARACTERS = 2000
_DEEPEST = 50


@dataclass(frozen=True, slots=True)
class _Token:
    sort: str
    text: str
    at: int


@dataclass(frozen=True, slots=True)
class Comparison:
    column: str
    operation: str
    value: str = ""


@dataclass(frozen=True, slots=True)
class Not:
    inner: Node


@dataclass(frozen=True, slots=True)
class Join:
    word: str
    parts: tuple[Node, ...]


Node = Comparison | Not | Join


def bare(heading: str) -> str:
    """A heading without its unit."""
    return heading.split(" [")[0]


def parse(text: str, columns: Sequence[str]) -> Node:
    """The tree of an expression over `columns` (headings, with or without units).

    Raises
    ------
    Usage
        If the expression cannot be read; says where and what would do.
    """
    if len(text) > _MOST_CHARACTERS:
        raise Usage(f"The condition is longer than {_MOST_CHARACTERS} characters.")
    parser = _Parser(text, _tokens(text), {bare(c).casefold(): c for c in columns})
    node = parser.expression()
    if parser.peek() is not None:
        parser.fail("'and' or 'or'; a text of several words stands in quotes")
    return node


def named(node: Node) -> set[str]:
    """The columns that an expression names, without their units."""
    if isinstance(node, Comparison):
        return {bare(node.column)}
    parts = (node.inner,) if isinstance(node, Not) else node.parts
    return set().union(*map(named, parts))


def _tokens(text: str) -> list[_Token]:
    tokens, at = [], 0
    while at < len(text.rstrip()):
        match = _TOKEN.match(text, at)
        if match is None or match.lastgroup is None:
            raise Usage(
                f"Cannot read the condition from {quoted(text[at:].strip())} on: texts stand in straight "
                "quotes, such as 'sand', with one at each end."
            )
        tokens.append(_Token(match.lastgroup, match[match.lastgroup], match.start(match.lastgroup)))
        at = match.end()
    return tokens


class _Parser:
    def __init__(self, text: str, tokens: list[_Token], columns: dict[str, str]) -> None:
        self.text, self.tokens, self.columns = text, tokens, columns
        self.place = 0
        self.depth = 0

    def peek(self) -> _Token | None:
        return self.tokens[self.place] if self.place < len(self.tokens) else None

    def fail(self, wanted: str) -> None:
        token = self.peek()
        found = f"found {quoted(self.text[token.at :])}" if token else "it ends too soon"
        raise Usage(f"Cannot read the condition {quoted(self.text)}: {found}; wanted {wanted}.")

    def word(self, *words: str) -> bool:
        token = self.peek()
        if token is not None and token.sort == "word" and token.text.casefold() in words:
            self.place += 1
            return True
        return False

    def expression(self) -> Node:
        return self.joined("or", lambda: self.joined("and", self.negation))

    def joined(self, word: str, part: Callable[[], Node]) -> Node:
        parts = [part()]
        while self.word(word):
            parts.append(part())
        return parts[0] if len(parts) == 1 else Join(word, tuple(parts))

    def negation(self) -> Node:
        self.depth += 1
        if self.depth > _DEEPEST:
            raise Usage("The condition is nested too deeply.")
        try:
            if self.word("not"):
                return Not(self.negation())
            token = self.peek()
            if token is not None and token.text == "(" and token.sort == "bracket":
                self.place += 1
                node = self.expression()
                closing = self.peek()
                if closing is None or closing.text != ")":
                    self.fail("a closing bracket")
                self.place += 1
                return node
            return self.comparison()
        finally:
            self.depth -= 1

    def comparison(self) -> Node:
        column = self.column()
        if self.word("is"):
            negative = self.word("not")
            if not self.word("empty"):
                self.fail("'empty'")
            node = Comparison(column, "is empty")
            return Not(node) if negative else node
        if self.word("contains"):
            value = self.value()
            return Comparison(column, "contains", value)
        token = self.peek()
        if token is None or token.sort != "operator":
            self.fail("a comparison (=, !=, <, <=, >, >=), 'contains' or 'is empty'")
        assert token is not None
        self.place += 1
        return Comparison(column, token.text, self.value())

    def column(self) -> str:
        words: list[str] = []
        start = self.place
        while (token := self.peek()) is not None and token.sort in {"word", "text"}:
            if token.text.casefold() in _WORDS and words:
                break
            words.append(_unquoted(token))
            self.place += 1
        name = " ".join(words)
        name = re.sub(r"\s*\[[^\]]*\]$", "", name).casefold()
        if not words:
            self.fail("the name of a column")
        if name not in self.columns:
            self.place = start
            known = [bare(c) for c in self.columns.values()]
            raise Usage(f"There is no column {quoted(' '.join(words))}; {did_you_mean(name, known, 40)}")
        return self.columns[name]

    def value(self) -> str:
        token = self.peek()
        if token is None or token.sort not in {"number", "text", "word"} or token.text.casefold() in _WORDS:
            self.fail("a number, or a text in quotes")
        assert token is not None
        self.place += 1
        return _unquoted(token)


def _unquoted(token: _Token) -> str:
    if token.sort != "text":
        return token.text
    quote, body = token.text[0], token.text[1:-1]
    return re.sub(rf"\\(.)|{quote}{quote}", lambda match: match[1] or quote, body, flags=re.DOTALL)


def apply(node: Node, frame: pd.DataFrame) -> Mask:
    """Where the expression holds in a frame that has its columns."""
    return _truth(node, frame)[0]


def _truth(node: Node, frame: pd.DataFrame) -> tuple[Mask, Mask]:
    """Where a node is true and where it is false; about an empty value it is neither."""
    if isinstance(node, Not):
        true, false = _truth(node.inner, frame)
        return false, true
    if isinstance(node, Join):
        truths, falsehoods = zip(*(_truth(part, frame) for part in node.parts), strict=True)
        if node.word == "and":
            return np.logical_and.reduce(truths), np.logical_or.reduce(falsehoods)
        return np.logical_or.reduce(truths), np.logical_and.reduce(falsehoods)
    column = frame[node.column]
    empty = _empty(column)
    if node.operation == "is empty":
        return empty, ~empty
    found = _compared(node, column)
    return found & ~empty, ~found & ~empty


def _compared(node: Comparison, column: pd.Series[Any]) -> Mask:
    if pd.api.types.is_numeric_dtype(column):
        if node.operation == "contains":
            raise Usage(f"'{bare(node.column)}' holds numbers; 'contains' is for texts.")
        if not re.fullmatch(_NUMBER, node.value.strip()):
            raise Usage(
                f"'{bare(node.column)}' holds numbers; it cannot be compared with {quoted(node.value)}. "
                "A number is written with a decimal point, such as 0.12."
            )
        compared = _COMPARE[node.operation](column.to_numpy(dtype=np.float64), float(node.value))
        return np.asarray(compared, dtype=np.bool_)
    wanted = _plain(node.value)
    texts = [_plain(v) for v in column]
    if node.operation == "contains":
        return np.array([wanted in t for t in texts], dtype=np.bool_)
    if node.operation in {"=", "==", "!=", "<>"}:
        compare = _COMPARE[node.operation]
        return np.array([compare(t, wanted) for t in texts], dtype=np.bool_)
    raise Usage(f"'{bare(node.column)}' holds texts: use =, != or contains.")


def _plain(value: object) -> str:
    return unicodedata.normalize("NFC", str(value)).strip().casefold()


def _empty(column: pd.Series[Any]) -> Mask:
    missing = column.isna().to_numpy(dtype=np.bool_)
    if pd.api.types.is_numeric_dtype(column):
        return missing
    return missing | np.array([v == "" for v in column], dtype=np.bool_)
