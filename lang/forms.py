"""The form of a value: what kind of node each kind of slot takes, and the node an item becomes in it.

Dimensions and types are the compiler's business; a form is what can be seen without knowing any name.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from .items import Equation, Item, Place, Series, expression_of, path_of, plain_name, setting_of
from .scanner import RESERVED, Slip
from .tree import (
    Call,
    Date,
    Expression,
    Name,
    Number,
    Parameter,
    Path,
    Range,
    Ratio,
    Setting,
    Text,
    Truth,
    Tuple,
    Value,
)
from .units import UNITS
from .words import CONSTANTS, SHAPE_WORDS

_NEVER_QUANTITY = (Text, Truth, Date, Range, Ratio, Tuple)
_NEVER_POINT = (Number, Text, Truth, Date, Range, Ratio)

# What each kind refuses of all expressions, because it could never fit.
_REFUSED: Mapping[str, tuple[type, ...]] = MappingProxyType(
    {
        "any": (),
        "truth": (Number, Text, Date, Range, Ratio, Tuple),
        "point": _NEVER_POINT,
        "point2": _NEVER_POINT,
        "vector": _NEVER_POINT,
        "direction": _NEVER_POINT,
        "axis": _NEVER_POINT,
    }
)
# What each kind takes and nothing else.
_TAKEN: Mapping[str, tuple[type, ...]] = MappingProxyType(
    {
        "text": (Text,),
        "path": (Path,),
        "thing": (Path, Call),
        "range": (Range,),
        "ratio": (Ratio, Path),
        "date": (Date, Path),
        "clock": (Ratio, Path),
        "colour": (Text, Path),
    }
)
_SIZES: Mapping[str, int] = MappingProxyType({"point": 3, "point2": 2, "vector": 3, "direction": 3, "axis": 3})


def value_of(place: Place, kind: str, item: Item) -> Value | None:
    """What an item is in a slot of this kind, or None where its form does not fit. Raises Slip where it can say more.

    Signatures and words are read by the reader, for they fill more than one slot or take more than one item.
    """
    match kind:
        case "new":
            return new_name(place, item)
        case "settings":
            return _settings(item)
        case "list":
            return _list(place, item)
        case "names":
            return _names(place, item)
    node = expression_of(place, item)
    if node is None:
        return None
    if kind == "thing":
        _check_thing(node)
    return node if fits(kind, node) else None


def _check_thing(node: Expression) -> None:
    """Raises Slip for a shape's word where a part is named: its parenthesis touches, or it is out of place."""
    path = node.path if isinstance(node, Call) else node
    name = plain_name(path)
    if name not in SHAPE_WORDS:
        return
    start = path.span.column - 1
    end = path.span.end_column - 1
    if isinstance(node, Call):
        sentence = f"the parenthesis behind the word `{name}` does not touch it"
        raise Slip("call-space", start, end + 1, sentence, f"write `{name} (`")
    raise Slip(
        "misplaced-word", start, end, f"`{name}` is a shape, and here the name of a part is expected", "make it a part"
    )


def fits(kind: str, node: Expression) -> bool:
    """Whether an expression has a form that a slot of this kind can take."""
    taken = _TAKEN.get(kind)
    if taken is not None:
        return isinstance(node, taken)
    if isinstance(node, _REFUSED.get(kind, _NEVER_QUANTITY)):
        return False
    size = _SIZES.get(kind)
    return size is None or not isinstance(node, Tuple) or len(node.items) == size


def new_name(place: Place, item: Item) -> Name | None:
    """The name that an item declares. Raises Slip where the language keeps that name for itself."""
    if item.node is not None or not item.word:
        return None
    check_name(item.word, item.start, item.end)
    return Name(item.word, place.span(item.start, item.end))


def check_name(name: str, start: int, end: int) -> None:
    """Raises Slip where a declared name is a unit symbol, a shape word or reserved."""
    if name in UNITS:
        meaning = f"the unit {UNITS[name].name}"
    elif name in SHAPE_WORDS:
        meaning = "a shape"
    elif name in RESERVED:
        meaning = "a word reserved for values"
    elif name in CONSTANTS:
        meaning = "a constant of the language"
    else:
        return
    raise Slip(
        "reserved-name", start, end, f"`{name}` is {meaning} and cannot be declared", f"call it `{name}_1`, or better"
    )


def signature_of(place: Place, item: Item) -> tuple[Name, tuple[Parameter, ...] | None] | None:
    """The name an item declares, and its parameters where it has parentheses. Raises Slip for one that is none."""
    if item.node is None:
        name = new_name(place, item)
        return None if name is None else (name, None)
    call = item.node
    if not isinstance(call, Call) or len(call.path.steps) != 1 or call.path.steps[0].index is not None:
        return None
    step = call.path.steps[0]
    check_name(step.name, step.span.column - 1, step.span.end_column - 1)
    parameters = [_parameter(node) for node in (*call.positional, *call.named)]
    parameters.sort(key=lambda parameter: parameter.span)
    return Name(step.name, step.span), tuple(parameters)


def _parameter(node: Expression | Setting) -> Parameter:
    if isinstance(node, Setting):
        name, default, where = node.name, node.value, node.name_span
    elif isinstance(node, Path) and len(node.steps) == 1 and node.steps[0].index is None:
        name, default, where = node.steps[0].name, None, node.span
    else:
        raise Slip(
            "wrong-form",
            node.span.column - 1,
            node.span.end_column - 1,
            "expected the name of a parameter, or `name = default`",
        )
    check_name(name, where.column - 1, where.end_column - 1)
    return Parameter(name, default, node.span)


def _settings(item: Item) -> tuple[Setting, ...] | None:
    entries = item.node.entries if isinstance(item.node, Series) else (item.node,)
    settings = []
    for entry in entries:
        if not isinstance(entry, Equation):
            return None
        settings.append(setting_of(entry))
    return tuple(settings)


def _list(place: Place, item: Item) -> tuple[Expression, ...] | None:
    if isinstance(item.node, Series):
        entries = []
        for entry in item.node.entries:
            if isinstance(entry, Equation):
                return None
            entries.append(entry)
        return tuple(entries)
    node = expression_of(place, item)
    return None if node is None else (node,)


def _names(place: Place, item: Item) -> tuple[Expression, ...] | None:
    if item.node is None:
        return (path_of(place, item.word, item.start),)
    entries = _list(place, item)
    if entries is None or not all(isinstance(entry, Path) for entry in entries):
        return None
    return entries
