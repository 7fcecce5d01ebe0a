"""Parameters and derived values: from declarations and settings to the names of a scope."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Related
from platewright.lang.source import Span

from .expressions import Failed, Formula, Scope, evaluate
from .functions import CONSTANTS
from .mistakes import Problems, mistake
from .modules import Declaration, Module, names_in, order
from .readings import expression, optional, parameters
from .readings import name as declared_name
from .values import Interval, Quantity, Value, kind_of, spell

Named = dict[str, "Value | Formula | Failed"]


@dataclass(frozen=True, slots=True)
class Setting:
    """A parameter set from outside, where it was set, and the value."""

    name: str
    value: Value
    span: Span


def outermost() -> Scope:
    """The scope around every file: the language's constants."""
    return Scope(dict(CONSTANTS))


def module_scope(
    module: Module, prefixes: Mapping[str, Scope], settings: tuple[Setting, ...], problems: Problems, outer: Scope
) -> Scope:
    """The parameters and derived values of one file, each computed after those it depends on."""
    named: Named = {}
    scope = Scope(named, outer, prefixes, None, outer.budget)
    valued = {name: each for name, each in module.names.items() if each.kind in ("given", "derived")}
    chosen = _accept(settings, valued, problems)
    for declaration in in_order(valued.values(), named, problems):
        named[declaration.name] = Failed()
        with problems.collecting():
            if declaration.kind == "given":
                named[declaration.name] = _given(declaration, chosen.get(declaration.name), scope)
            else:
                named[declaration.name] = derived_value(declaration, scope)
    return scope


def in_order(declarations: Iterable[Declaration], named: Named, problems: Problems) -> list[Declaration]:
    """Values in an order in which each can be computed.

    Those that depend on themselves are reported and marked failed.
    """
    valued = {declaration.name: declaration for declaration in declarations}
    depends = {name: _depends(declaration, valued) for name, declaration in valued.items()}
    sequence, circles = order(depends)
    for circle in circles:
        way = " needs ".join(f"`{name}`" for name in circle)
        related = tuple(Related(valued[name].span, "part of the circle") for name in circle[1:-1])
        sentence = f"this value needs itself: {way}" if len(circle) > 2 else f"`{circle[0]}` needs itself"
        problems.error("circular-value", valued[circle[0]].span, sentence, "", related)
    left_out = [name for name in valued if name not in set(sequence)]
    named.update((name, Failed()) for name in left_out)
    return [valued[name] for name in sequence]


def derived_value(declaration: Declaration, scope: Scope) -> Value | Formula:
    """The value of a `derived` line, or the function it defines. Raises Mistake."""
    body = expression(declaration.line.head, "value")
    wanted = parameters(declaration.line)
    if not wanted:
        return evaluate(body, scope)
    return Formula(declaration.name, tuple(parameter.name for parameter in wanted), body, scope)


def local_scope(lines: tuple[tree.Line, ...], scope: Scope, problems: Problems) -> Scope:
    """The scope inside a part or assembly: its `derived` values on top of its parameters."""
    declarations = []
    for line in lines:
        if line.word == "derived":
            for below in line.lines:
                name = declared_name(below.head)
                declarations.append(Declaration("derived", name.text, name.span, below))
    if not declarations:
        return scope
    named: Named = {}
    inner = scope.inside(named)
    for declaration in in_order(declarations, named, problems):
        named[declaration.name] = Failed()
        with problems.collecting():
            named[declaration.name] = derived_value(declaration, inner)
    return inner


def arguments(declaration: Declaration, call: tree.Call | None, scope: Scope, home: Scope, span: Span) -> Named:
    """The parameters of a thing: those given in a call, evaluated in `scope`, else its defaults, evaluated at `home`.

    A default may use the parameters before it. Raises Mistake.
    """
    wanted = parameters(declaration.line)
    given = _given_arguments(declaration, wanted, call, scope)
    named: Named = {}
    inner = home.inside(named)
    for parameter in wanted:
        if parameter.name in given:
            value = given[parameter.name]
            if parameter.default is not None and call is not None:
                _same_kind(parameter.name, value, evaluate(parameter.default, inner), call.span)
        elif parameter.default is not None:
            value = evaluate(parameter.default, inner)
        else:
            related = (Related(parameter.span, "declared here, without a default"),)
            sentence = f"`{declaration.name}` needs `{parameter.name}`"
            hint = f"write `{declaration.name}({parameter.name} = …)`"
            raise mistake("wrong-parameters", span, sentence, hint, related)
        named[parameter.name] = value
    return named


def _given_arguments(
    declaration: Declaration, wanted: tuple[tree.Parameter, ...], call: tree.Call | None, scope: Scope
) -> dict[str, Value]:
    if call is None:
        return {}
    names = [parameter.name for parameter in wanted]
    if len(call.positional) > len(names):
        count = {0: "no parameters", 1: "one parameter"}.get(len(names), f"{len(names)} parameters")
        raise mistake(
            "wrong-parameters", call.span, f"`{declaration.name}` has {count}, found {len(call.positional)} values"
        )
    given = {name: evaluate(each, scope) for name, each in zip(names, call.positional, strict=False)}
    for setting in call.named:
        if setting.name not in names:
            near = nearest(setting.name, names)
            hint = f"did you mean `{near}`?" if near else ""
            sentence = f"`{declaration.name}` has no parameter `{setting.name}`"
            raise mistake("unknown-name", setting.name_span, sentence, hint)
        if setting.name in given:
            raise mistake("wrong-parameters", setting.span, f"`{setting.name}` is given twice")
        given[setting.name] = evaluate(setting.value, scope)
    return given


def _depends(declaration: Declaration, valued: Mapping[str, Declaration]) -> list[str]:
    own = {parameter.name for parameter in parameters(declaration.line)}
    first = [path.steps[0].name for path in names_in(declaration.line.head)]
    return [name for name in dict.fromkeys(first) if name in valued and name not in own]


def _accept(settings: tuple[Setting, ...], valued: Mapping[str, Declaration], problems: Problems) -> dict[str, Setting]:
    chosen: dict[str, Setting] = {}
    for setting in settings:
        declaration = valued.get(setting.name)
        if declaration is None or declaration.kind != "given":
            near = nearest(setting.name, [name for name, each in valued.items() if each.kind == "given"])
            sentence = f"there is no parameter `{setting.name}` to set"
            if declaration is not None:
                sentence = f"`{setting.name}` is derived; only parameters under `given` can be set"
            problems.error("unknown-name", setting.span, sentence, f"did you mean `{near}`?" if near else "")
        else:
            chosen[setting.name] = setting
    return chosen


def _given(declaration: Declaration, setting: Setting | None, scope: Scope) -> Value:
    head = declaration.line.head
    written = expression(head, "default")
    default = evaluate(written, scope)
    _within_limits(declaration, default, written.span, scope)
    if setting is None:
        return default
    value = _same_kind(declaration.name, setting.value, default, setting.span)
    _within_limits(declaration, value, setting.span, scope)
    return value


def _same_kind(name: str, value: Value, default: Value, span: Span) -> Value:
    """The value, if it is of the default's kind; the bare 0 takes the default's dimension. Raises Mistake."""
    if isinstance(value, Quantity) and isinstance(default, Quantity):
        if value.dimension == default.dimension or default.bare_zero:
            return value
        if value.bare_zero:
            return Quantity(0.0, default.dimension)
    elif type(value) is type(default):
        return value
    raise mistake("wrong-kind", span, f"`{name}` is {kind_of(default)}, found {kind_of(value)}")


def _within_limits(declaration: Declaration, value: Value, span: Span, scope: Scope) -> None:
    head = declaration.line.head
    written = optional(head, "range")
    related = (
        (Related(declaration.span, "declared here"),)
        if span.file != declaration.span.file or span.line != declaration.span.line
        else ()
    )
    if written is not None:
        allowed = evaluate(written, scope)
        if not isinstance(allowed, Interval):
            raise mistake(
                "wrong-kind", written.span, f"expected a range such as `1 mm .. 5 mm`, found {kind_of(allowed)}"
            )
        if not isinstance(value, Quantity) or (value.dimension != allowed.low.dimension and not value.bare_zero):
            raise mistake(
                "wrong-kind", written.span, f"the range does not fit: `{declaration.name}` is {kind_of(value)}"
            )
        if not allowed.low.value <= value.value <= allowed.high.value:
            sentence = f"`{declaration.name}` is {spell(value)}, outside its range {spell(allowed)}"
            raise mistake("out-of-range", span, sentence, "", related)
    choices = head.get("choices")
    if isinstance(choices, tuple):
        allowed_values = [
            evaluate(each, scope) for each in choices if not isinstance(each, (tree.Setting, tree.Parameter))
        ]
        if value not in allowed_values:
            options = ", ".join(spell(each) for each in allowed_values)
            near = (
                nearest(value, [each for each in allowed_values if isinstance(each, str)])
                if isinstance(value, str)
                else None
            )
            sentence = f"`{declaration.name}` is {spell(value)}, expected one of {options}"
            raise mistake("out-of-range", span, sentence, f'did you mean "{near}"?' if near else "", related)
