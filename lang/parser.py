"""The grammar of one value as an LALR parser that builds tree nodes as it reduces (grammar.lark)."""

from __future__ import annotations

import functools
import pkgutil
from collections.abc import Iterator
from typing import Any

from lark import Lark
from lark.lexer import Lexer
from msgspec.structs import replace

from .fold import fold
from .items import Equation, Node, Series, setting_of
from .source import Span
from .tree import Call, Expression, Path, Step, Tuple


class Token:
    """A scanned token: its terminal, and what it stands for.

    That is a node, an operator with its columns, or the 0-based column in which a bracket or comma ends.

    The class attributes are what lark copies from the last token to its end token.
    """

    __slots__ = ("type", "value")
    start_pos = line = column = end_line = end_column = end_pos = 0

    def __init__(self, terminal: str, value: Any) -> None:
        self.type = terminal
        self.value = value


class _Handed(Lexer):
    """Hands over tokens that have been scanned before."""

    __future_interface__ = 2

    def __init__(self, lexer_conf: Any) -> None:
        pass

    def lex(self, lexer_state: Any, parser_state: Any) -> Iterator[Any]:
        return iter(lexer_state.text)


@functools.cache
def value_parser() -> Lark:
    """The LALR tables of the grammar, made once a process (about 10 ms): a pure function of the grammar file."""
    # lark has `pkgutil` at hand; `importlib.resources` would import what reads archives.
    grammar = pkgutil.get_data(__package__, "grammar.lark")
    assert grammar is not None
    return Lark(
        grammar.decode(),
        parser="lalr",
        lexer=_Handed,
        transformer=_Builder(),
        start="series",
        keep_all_tokens=True,
        maybe_placeholders=False,
    )


class _Builder:
    """What each alias of the grammar makes of its children."""

    @staticmethod
    def one(children: list[Any]) -> Any:
        return children[0]

    @staticmethod
    def leaf(children: list[Any]) -> Any:
        return children[0].value

    @staticmethod
    def further_entry(children: list[Any]) -> Series:
        first, _, last = children
        before = first.entries if isinstance(first, Series) else (first,)
        return Series((*before, last), first.span.to(last.span))

    @staticmethod
    def equation(children: list[Any]) -> Equation:
        left, _, right = children
        return Equation(left, right, left.span.to(right.span))

    @staticmethod
    def folded(children: list[Any]) -> Expression:
        return fold(children[0])

    @staticmethod
    def prefixed(children: list[Any]) -> list[Any]:
        return [children[0].value, children[1]]

    @staticmethod
    def prefixed_more(children: list[Any]) -> list[Any]:
        return [children[0].value, *children[1]]

    @staticmethod
    def joined(children: list[Any]) -> list[Any]:
        return [children[0], children[1].value, children[2]]

    @staticmethod
    def joined_more(children: list[Any]) -> list[Any]:
        return [children[0], children[1].value, *children[2]]

    @staticmethod
    def group(children: list[Any]) -> Expression:
        opening, inner, closing = children
        grouped: Expression = replace(inner, span=_enclosed(inner.span, opening.value, closing.value))
        return grouped

    @staticmethod
    def point(children: list[Any]) -> Tuple:
        opening, values, closing = children
        return Tuple(tuple(values), _enclosed(values[0].span, opening.value, closing.value))

    @staticmethod
    def values_first(children: list[Any]) -> list[Expression]:
        return [children[0], children[2]]

    @staticmethod
    def values_more(children: list[Any]) -> list[Expression]:
        return [*children[0], children[2]]

    @staticmethod
    def call_empty(children: list[Any]) -> Call:
        name, _, closing = children
        path = name.value
        return Call(path, (), (), _to(path.span, closing.value))

    @staticmethod
    def call(children: list[Any]) -> Call:
        name, _, given, closing = children
        path = name.value
        entries: tuple[Node, ...] = given.entries if isinstance(given, Series) else (given,)
        positional = tuple(entry for entry in entries if not isinstance(entry, Equation | Series))
        named = tuple(setting_of(entry) for entry in entries if isinstance(entry, Equation))
        return Call(path, positional, named, _to(path.span, closing.value))

    @staticmethod
    def indexed_name(children: list[Any]) -> Path:
        name, _, index, closing = children
        return _index(name.value, index, closing)

    @staticmethod
    def indexed(children: list[Any]) -> Path:
        path, _, index, closing = children
        return _index(path, index, closing)

    @staticmethod
    def stepped(children: list[Any]) -> Path:
        path, _, name = children
        return Path((*path.steps, *name.value.steps), path.span.to(name.value.span))


def _index(path: Path, index: Expression, closing: Token) -> Path:
    last = path.steps[-1]
    step = Step(last.name, index, _to(last.span, closing.value))
    return Path((*path.steps[:-1], step), _to(path.span, closing.value))


def _to(span: Span, end: int) -> Span:
    """The span up to the 0-based column `end` of the same line."""
    return Span(span.file, span.line, span.column, span.line, end + 1)


def _enclosed(inner: Span, opening: int, closing: int) -> Span:
    """The span from an opening bracket that ends in column `opening` to a closing one that ends in `closing`."""
    return Span(inner.file, inner.line, opening, inner.line, closing + 1)
