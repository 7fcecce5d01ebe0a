"""Trees back into text: expressions for messages, and the one canonical layout of a file.

Four spaces a level, one space between words, no alignment, at most one blank line, every comment kept. A sum has a
space on both sides of its sign; a product is closed up inside parentheses and beside a sum where neither side carries
a unit, and spaced elsewhere.
"""

from __future__ import annotations

from typing import Any

from msgspec import Struct

from .fold import STRENGTH
from .items import Equation, Item, Node, Series
from .layout import FILE_LIMIT, INDENT, LINE_LIMIT, Aside, Layout, RawLine
from .problems import Problem, Severity, is_error
from .reader import read_layout, read_scene
from .source import Span
from .tree import Binary, Call, Choice, Date, Expression, Number, Path, Range, Ratio, Setting, Text, Truth, Tuple, Unary

_MENDED = frozenset({"tab"})
_ATOM = 11
_PRODUCTS = frozenset({"*", "/", "^"})


def format_text(file: str, text: str) -> tuple[str | None, tuple[Problem, ...]]:
    """The canonical layout of a file, or None with the problems of shape that stand in the way.

    Words that the vocabulary does not know do not stand in the way; tabs are mended. The tree of the result is compared
    with the tree of the source, and every comment counted; a difference raises RuntimeError, for it is our fault.
    Cost: the file is read four times.
    """
    layout = read_layout(file, text)
    problems = tuple(problem for problem in layout.problems if problem.code not in _MENDED)
    if any(is_error(problem) for problem in problems):
        return None, problems
    formatted = print_layout(layout)
    problems = _too_long(layout, formatted)
    if problems:
        return None, problems
    if _essence(read_scene(file, text)[0]) != _essence(read_scene(file, formatted)[0]):
        raise RuntimeError("formatting would have changed the meaning of a file")
    again = read_layout(file, formatted)
    if again.problems or _lines_essence(layout) != _lines_essence(again):
        raise RuntimeError("formatting would have changed a line or a comment of a file")
    return formatted, ()


def _too_long(layout: Layout, formatted: str) -> tuple[Problem, ...]:
    """Problems where the canonical layout would go beyond the limits of size that reading keeps."""
    start = Span(layout.file, 1, 1, 1, 1)
    if len(formatted) > FILE_LIMIT:
        sentence = f"in canonical layout this file has {len(formatted)} characters, and a file may have {FILE_LIMIT}"
        return (Problem("file-too-long", Severity.ERROR, start, sentence, "split it, and join the files by `see`"),)
    longest = max(formatted.split("\n"), key=len)
    if len(longest) <= LINE_LIMIT:
        return ()
    sentence = f"in canonical layout the line `{longest.strip()[:40]}…` has {len(longest)} characters"
    hint = f"a line may have {LINE_LIMIT}; put long lists into a table"
    return (Problem("line-too-long", Severity.ERROR, start, sentence, hint),)


def print_layout(layout: Layout) -> str:
    """The text of a layout in canonical form; a layout with broken lines is the caller's bug."""
    printed: list[str] = []
    for raw in layout.lines:
        _print_line(raw, 0, printed)
    _print_asides(layout.below, printed)
    while printed and not printed[-1]:
        printed.pop()
    return "".join(line + "\n" for line in printed)


def _print_line(raw: RawLine, depth: int, printed: list[str]) -> None:
    _print_asides(raw.above, printed)
    words = " ".join(print_item(item) for item in raw.items)
    comment = f" {raw.comment}" if raw.comment else ""
    printed.append(" " * (INDENT * depth) + words + comment)
    for line in raw.lines:
        _print_line(line, depth + 1, printed)


def _print_asides(asides: list[Aside], printed: list[str]) -> None:
    for aside in asides:
        if aside.text:
            printed.append(" " * (INDENT * aside.depth) + aside.text)
        elif printed and printed[-1]:
            printed.append("")


def print_item(item: Item) -> str:
    """One item of a line."""
    return item.word if item.node is None else print_node(item.node)


def print_node(node: Node) -> str:
    """An expression, an equation or a series of them."""
    if isinstance(node, Series):
        return ", ".join(print_node(entry) for entry in node.entries)
    if isinstance(node, Equation):
        return f"{print_expression(node.left)} = {print_expression(node.right)}"
    return print_expression(node)


def print_expression(node: Expression) -> str:
    """An expression as its author would write it; reading it again gives the same tree. For messages too."""
    return _print(node, 0, False)


def _print(node: Expression, strength: int, is_close: bool) -> str:
    """An expression where operators weaker than `strength` need parentheses; `is_close` closes products up."""
    own = _strength(node)
    if own < strength:
        return f"({_print(node, 0, True)})"
    match node:
        case Binary():
            return _print_binary(node, own, is_close)
        case Unary("not", operand):
            return f"not {_print(operand, own, is_close)}"
        case Unary(_, operand):
            return f"-{_print(operand, own, is_close)}"
        case Choice(condition, then, otherwise):
            said = (
                _print(then, own + 1, is_close),
                _print(condition, own + 1, is_close),
                _print(otherwise, own, is_close),
            )
            return f"{said[0]} if {said[1]} else {said[2]}"
        case Range(low, high):
            return f"{_print(low, own + 1, is_close)} .. {_print(high, own + 1, is_close)}"
    return _print_atom(node)


def _print_atom(node: Expression) -> str:
    match node:
        case Number(text, unit):
            return f"{text} {unit}" if unit else text
        case Text():
            return _print_text(node)
        case Truth(value):
            return "yes" if value else "no"
        case Date(text):
            return text
        case Ratio(first, second):
            return f"{first}:{second}"
        case Path():
            return _print_path(node)
        case Call(path, positional, named):
            given = [_print(argument, 0, True) for argument in positional]
            given += [_print_setting(setting) for setting in named]
            return f"{_print_path(path)}({', '.join(given)})"
        case Tuple(items):
            return f"({', '.join(_print(item, 0, True) for item in items)})"
    raise TypeError(f"not an expression: {type(node).__name__}")


def _print_setting(setting: Setting) -> str:
    return f"{setting.name} = {_print(setting.value, 0, True)}"


def _print_path(path: Path) -> str:
    return ".".join(
        step.name if step.index is None else f"{step.name}[{_print(step.index, 0, True)}]" for step in path.steps
    )


def _print_text(text: Text) -> str:
    said = []
    for part in text.parts:
        if isinstance(part, str):
            for letter, written in (("\\", "\\\\"), ('"', '\\"'), ("\n", "\\n"), ("{", "\\{"), ("}", "\\}")):
                part = part.replace(letter, written)
            said.append(part)
        else:
            said.append(f"{{{_print(part, 0, True)}}}")
    return f'"{"".join(said)}"'


def _strength(node: Expression) -> int:
    match node:
        case Binary():
            return STRENGTH[node.operator]
        case Unary("not"):
            return STRENGTH["not"]
        case Unary():
            return STRENGTH["sign"]
        case Number(text) if text[0] == "-":
            return STRENGTH["sign"]
        case Choice():
            return STRENGTH["if"]
        case Range():
            return STRENGTH[".."]
    return _ATOM


def _print_binary(node: Binary, own: int, is_close: bool) -> str:
    operator = node.operator
    is_product = operator in _PRODUCTS
    is_closed_up = is_product and is_close and _is_bare(node)
    inner = is_close or not is_product
    is_comparison = own == STRENGTH["is"]
    left = _print(node.left, own + (is_comparison or operator == "^"), inner)
    right = _print(node.right, STRENGTH["sign"] if operator == "^" else own + 1, inner)
    return f"{left}{operator}{right}" if is_closed_up else f"{left} {operator} {right}"


def _is_bare(node: Expression) -> bool:
    """Whether nothing in a product carries a unit, so that closing it up cannot be misread."""
    match node:
        case Binary(operator, left, right) if operator in _PRODUCTS:
            return _is_bare(left) and _is_bare(right)
        case Unary(_, operand):
            return _is_bare(operand)
        case Number():
            return not node.unit and "/" not in node.text
        case Range() | Choice() | Ratio() | Date() | Truth() | Text():
            return False
    return True


# --- what formatting must not change


def _essence(node: Any) -> Any:
    """A tree without its places, as nested tuples."""
    if isinstance(node, tuple):
        return tuple(_essence(part) for part in node)
    if isinstance(node, Struct):
        kept = (getattr(node, name) for name in node.__struct_fields__ if not name.endswith("span"))
        return (type(node).__name__, *(_essence(part) for part in kept))
    return node


def _lines_essence(layout: Layout) -> Any:
    below = tuple(aside.text for aside in layout.below if aside.text)
    return tuple(_line_essence(raw) for raw in layout.lines), below


def _line_essence(raw: RawLine) -> Any:
    items = tuple(item.word or _essence(item.node) for item in raw.items)
    above = tuple(aside.text for aside in raw.above if aside.text)
    return items, raw.comment, above, tuple(_line_essence(line) for line in raw.lines)
