"""A small grammar of conditions on the columns of the store, compiled to SQL with every value bound.

::

    condition : either, or several joined by "or"
    either    : one, or several joined by "and"
    one       : "not" one | "(" condition ")" | column test
    test      : = == != <> < <= > >=  and a value
              | ["not"] "in" "(" value, value, ... ")"
              | ["not"] "like" "text"      with % for any text and _ for one character, capitals or not
              | "is" ["not"] "null"
    value     : a number, or a text in single or double quotes (doubled within)
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import NoReturn

from ehmo.errors import InputError
from ehmo.store.columns import BOND_COLUMNS, PROVENANCE_COLUMNS, STRUCTURE_COLUMNS, Column
from ehmo.store.packing import storable

LONGEST_TEXT = 100_000
MOST_VALUES = 10_000
MOST_TESTS = 400
DEEPEST = 50

_COLUMNS: Mapping[str, tuple[str, Column]] = {
    **{column.name: ("structures", column) for column in (*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS)},
    **{column.name: ("bonds", column) for column in BOND_COLUMNS},
}
_TOKEN = re.compile(
    r"""\s*(?:(?P<number>[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?(?![\w.]))
    |(?P<text>'(?:[^']|'')*'|"(?:[^"]|"")*")|(?P<name>[A-Za-z_]\w*)|(?P<sign><=|>=|!=|<>|==|[=<>(),])|(?P<end>$))""",
    re.VERBOSE,
)
_COMPARISONS = {"=": "=", "==": "=", "!=": "<>", "<>": "<>", "<": "<", "<=": "<=", ">": ">", ">=": ">="}
_WORDS = ("and", "or", "not", "in", "like", "is", "null")


@dataclass(frozen=True, slots=True)
class Condition:
    """A condition on the columns of the store.

    Attributes
    ----------
    text : str
        As it was written.
    clause : str
        SQL on the tables ``structures`` and ``bonds``, with names of values in place of values.
    values : mapping of str to value
        Values to bind.
    of_bonds : bool
        Whether it speaks of columns of bonds.
    """

    text: str
    clause: str
    values: Mapping[str, str | int | float]
    of_bonds: bool


def condition(text: str) -> Condition:
    """Condition of its text, such as ``metal = 'V' and kind = 'oxo' and mayer < 2``.

    Parameters
    ----------
    text : str

    Returns
    -------
    condition : Condition

    Raises
    ------
    InputError
        With the place of the first character that does not fit.

    Examples
    --------
    >>> condition("mayer < 2 and metal in ('V', 'Cr')").clause
    '(bonds."mayer" < :value0 AND bonds."metal" IN (:value1, :value2))'
    """
    if len(text) > LONGEST_TEXT:
        raise InputError(f"the condition is longer than {LONGEST_TEXT} characters", place="--where", mend="shorten it")
    return _Parser(text).whole()


@dataclass(frozen=True, slots=True)
class _Token:
    kind: str
    text: str
    place: int


def _tokens(text: str) -> Iterator[_Token]:
    place = 0
    while True:
        found = _TOKEN.match(text, place)
        if found is None:
            start = place + len(text[place:]) - len(text[place:].lstrip())
            words = "a quotation mark is not closed" if text[start] in "'\"" else f"{text[start]!r} is not understood"
            _refuse(words, start, "see README for what a condition may hold")
        kind = found.lastgroup or ""
        start = found.start(kind)
        word = found[kind]
        if kind == "name" and word.lower() in _WORDS:
            yield _Token("word", word.lower(), start)
        else:
            yield _Token(kind, word, start)
        if kind == "end":
            return
        place = found.end()


def _refuse(words: str, place: int, mend: str) -> NoReturn:
    raise InputError(words, place=f"--where, character {place + 1}", mend=mend)


class _Parser:
    """Recursive descent over the tokens."""

    def __init__(self, text: str) -> None:
        self._text = text
        self._tokens = list(_tokens(text))
        self._at = 0
        self._values: dict[str, str | int | float] = {}
        self._tables: set[str] = set()
        self._tests = 0

    def whole(self) -> Condition:
        clause = self._joined("or", 0)
        if self._now.kind != "end":
            _refuse(f"{self._now.text!r} is not expected here", self._now.place, "join conditions with and, or")
        return Condition(self._text, clause, self._values, "bonds" in self._tables)

    @property
    def _now(self) -> _Token:
        return self._tokens[self._at]

    def _next(self) -> _Token:
        token = self._now
        self._at += 1
        return token

    def _is(self, *words: str) -> bool:
        """Take the token if it is one of these words or signs."""
        if self._now.kind in ("word", "sign") and self._now.text in words:
            self._at += 1
            return True
        return False

    def _expect(self, sign: str) -> None:
        if not self._is(sign):
            _refuse(f"{sign!r} is expected", self._now.place, "see README for what a condition may hold")

    def _joined(self, word: str, depth: int) -> str:
        parts = [self._joined("and", depth) if word == "or" else self._one(depth)]
        while self._is(word):
            parts.append(self._joined("and", depth) if word == "or" else self._one(depth))
        return parts[0] if len(parts) == 1 else f"({f' {word.upper()} '.join(parts)})"

    def _one(self, depth: int) -> str:
        if depth > DEEPEST:
            _refuse(f"more than {DEEPEST} conditions within one another", self._now.place, "write it flatter")
        if self._is("not"):
            return f"(NOT {self._one(depth + 1)})"
        if self._is("("):
            inner = self._joined("or", depth + 1)
            self._expect(")")
            return inner
        return self._test()

    def _test(self) -> str:
        self._tests += 1
        if self._tests > MOST_TESTS:
            _refuse(f"more than {MOST_TESTS} tests", self._now.place, "use in (...), or several runs")
        name, column = self._column()
        if self._is("is"):
            words = "IS NOT NULL" if self._is("not") else "IS NULL"
            if not self._is("null"):
                _refuse("null is expected after is", self._now.place, "write: is null, is not null")
            return f"{name} {words}"
        turned = "NOT " if self._is("not") else ""
        if self._is("in"):
            return f"{name} {turned}IN ({', '.join(self._list(column))})"
        if self._is("like"):
            return f"lower({name}) {turned}LIKE lower({self._pattern(column)}) ESCAPE '\\'"
        sign = self._next()
        if turned or sign.text not in _COMPARISONS or sign.kind != "sign":
            _refuse("a comparison is expected", sign.place, "use = != < <= > >=, in, like, is null")
        return f"{name} {_COMPARISONS[sign.text]} {self._value(column)}"

    def _column(self) -> tuple[str, Column]:
        token = self._next()
        if token.kind != "name":
            words = "the condition ends too early" if token.kind == "end" else f"{token.text!r} is no column"
            _refuse(words, token.place, "a condition starts with a column, such as mayer or metal")
        if token.text not in _COLUMNS:
            near = difflib.get_close_matches(token.text, _COLUMNS, 1, 0.5)
            hint = f"perhaps {near[0]}" if near else "README lists the columns"
            _refuse(f"no column {token.text!r}", token.place, hint)
        table, column = _COLUMNS[token.text]
        self._tables.add(table)
        return f'{table}."{column.name}"', column

    def _list(self, column: Column) -> list[str]:
        self._expect("(")
        names = [self._value(column)]
        while self._is(","):
            names.append(self._value(column))
        self._expect(")")
        return names

    def _pattern(self, column: Column) -> str:
        if column.kind != "text":
            _refuse(f"{column.name} is a number", self._now.place, "like is for text; compare numbers with < and >")
        pattern, place = self._now.text, self._now.place
        if (len(pattern) - len(pattern[:-1].rstrip("\\")) - 1) % 2:
            _refuse("the pattern ends in a backslash", place, "double it")
        return self._value(column)

    def _value(self, column: Column) -> str:
        token = self._next()
        if token.kind not in ("number", "text"):
            _refuse("a value is expected", token.place, "give a number, or a text in quotation marks")
        if (token.kind == "text") != (column.kind == "text"):
            words = (
                ("text", "put it in quotation marks") if column.kind == "text" else ("a number", "leave out the marks")
            )
            _refuse(f"{column.name} is {words[0]}, {token.text} is not", token.place, words[1])
        if len(self._values) >= MOST_VALUES:
            _refuse(f"more than {MOST_VALUES} values", token.place, "use several runs")
        name = f"value{len(self._values)}"
        self._values[name] = _text_of(token.text) if token.kind == "text" else _number_of(token)
        return f":{name}"


def _text_of(quoted: str) -> str:
    mark = quoted[0]
    return storable(quoted[1:-1].replace(mark * 2, mark))


def _number_of(token: _Token) -> int | float:
    try:
        whole = int(token.text)
    except ValueError:
        return float(token.text)
    return whole if abs(whole) < 2**63 else float(token.text)
