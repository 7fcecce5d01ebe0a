"""Parameters and derived values: from declarations and settings to the names of a scope."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Related
from platewright.lang.source import Span
from platewright.lang.units import NUMBER

from .arithmetic import same
from .expressions import evaluate
from .functions import CONSTANTS
from .mistakes import Problems, mistake
from .modules import Declaration, Module, names_in
from .ordering import order
from .readings import expression, optional, parameters
from .readings import name as declared_name
from .records import Tables, read_record
from .scope import Failed, Formula, Named, Record, Scope, did_you_mean
from .values import Interval, Quantity, Value, Vector, dimension_name, kind_of, shown, spell, usual_unit

Names = dict[str, Named]


class Setting(Struct, frozen=True):
    """A parameter set from outside, where it was set, and the value."""

    name: str
    value: Value
    span: Span


def outermost() -> Scope:
    """The scope around every file: the language's constants."""
    return Scope(dict(CONSTANTS))


def module_scope(
    module: Module,
    prefixes: Mapping[str, Scope],
    settings: tuple[Setting, ...],
    problems: Problems,
    outer: Scope,
    tables: Tables,
) -> Scope:
    """The parameters and derived values of one file, each computed after those it depends on.

    Names that stand on lines which could not be read, and prefixes of files that could not, are marked failed.
    """
    named: Names = {name: Failed() for name in module.broken if name not in module.names}
    lost = (name for name, each in module.names.items() if each.kind == "see" and name not in prefixes)
    named.update((name, Failed()) for name in lost)
    scope = Scope(named, outer, prefixes, None, outer.budget)
    valued = {name: each for name, each in module.names.items() if each.kind in ("given", "derived")}
    chosen = _accept(settings, module, problems)
    for declaration in in_order(valued.values(), named, problems):
        named[declaration.name] = Failed()
        with problems.collecting():
            if declaration.kind == "given":
                named[declaration.name] = _given(declaration, chosen.get(declaration.name), scope)
            else:
                named[declaration.name] = derived_value(declaration, scope, tables, module.file)
    return scope


def in_order(declarations: Iterable[Declaration], named: Names, problems: Problems) -> list[Declaration]:
    """Values in an order in which each can be computed.

    Those that depend on themselves are reported and marked failed.
    """
    valued = {declaration.name: declaration for declaration in declarations}
    depends = {name: _depends(declaration, valued) for name, declaration in valued.items()}
    sequence, circles = order(depends)
    for circle in circles:
        way = " needs ".join(f"`{name}`" for name in (circle if len(circle) <= 8 else [*circle[:4], "…", circle[-1]]))
        related = tuple(Related(valued[name].span, "part of the circle") for name in circle[1:-1][:8])
        sentence = f"this value needs itself: {way}" if len(circle) > 2 else f"`{circle[0]}` needs itself"
        problems.error("circular-value", valued[circle[0]].span, sentence, "", related)
    sound = set(sequence)
    named.update((name, Failed()) for name in valued if name not in sound)
    return [valued[name] for name in sequence]


def derived_value(
    declaration: Declaration, scope: Scope, tables: Tables, file: str, asked: Span | None = None
) -> Value | Formula | Record:
    """The value of a `derived` line, the function it defines, or the row it names. Raises Mistake."""
    if declaration.line.head.row == "derived row":
        return read_record(declaration.line.head, scope, tables, file, asked)
    body = expression(declaration.line.head, "value")
    wanted = parameters(declaration.line)
    if not wanted:
        return evaluate(body, scope)
    return Formula(declaration.name, tuple(parameter.name for parameter in wanted), body, scope)


def local_scope(
    lines: tuple[tree.Line, ...], scope: Scope, problems: Problems, tables: Tables, file: str, asked: Span
) -> Scope:
    """The scope inside a part or assembly: its `derived` values on top of its parameters.

    `file` holds the lines, `asked` is where the thing was asked for.
    """
    declarations = []
    for line in lines:
        if line.word == "derived":
            for below in line.lines:
                name = declared_name(below.head)
                declarations.append(Declaration("derived", name.text, name.span, below))
    if not declarations:
        return scope
    named: Names = {}
    inner = scope.inside(named)
    for declaration in in_order(declarations, named, problems):
        named[declaration.name] = Failed()
        with problems.collecting():
            named[declaration.name] = derived_value(declaration, inner, tables, file, asked)
    return inner


def arguments(declaration: Declaration, call: tree.Call | None, scope: Scope, home: Scope, span: Span) -> Names:
    """The parameters of a thing: those given in a call, evaluated in `scope`, else its defaults, evaluated at `home`.

    A default may use the parameters before it. Raises Mistake.
    """
    wanted = parameters(declaration.line)
    given = _given_arguments(declaration, wanted, call, scope)
    named: Names = {}
    inner = home.inside(named)
    for parameter in wanted:
        if parameter.name in given:
            value = given[parameter.name]
            if parameter.default is not None and call is not None:
                value = _same_kind(parameter.name, value, evaluate(parameter.default, inner), call.span)
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
        has = {0: "no parameters", 1: "one parameter"}.get(len(names), f"{len(names)} parameters")
        found = "one value" if len(call.positional) == 1 else f"{len(call.positional)} values"
        raise mistake("wrong-parameters", call.span, f"`{declaration.name}` has {has}, found {found}")
    given = {name: evaluate(each, scope) for name, each in zip(names, call.positional, strict=False)}
    for setting in call.named:
        if setting.name not in names:
            sentence = f"`{declaration.name}` has no parameter `{setting.name}`"
            raise mistake("unknown-name", setting.name_span, sentence, did_you_mean(nearest(setting.name, names)))
        if setting.name in given:
            raise mistake("wrong-parameters", setting.span, f"`{setting.name}` is given twice")
        given[setting.name] = evaluate(setting.value, scope)
    return given


def _depends(declaration: Declaration, valued: Mapping[str, Declaration]) -> list[str]:
    own = {parameter.name for parameter in parameters(declaration.line)}
    first = [path.steps[0].name for path in names_in(declaration.line.head)]
    return [name for name in dict.fromkeys(first) if name in valued and name not in own]


def is_given(setting: str, module: Module, span: Span, problems: Problems) -> bool:
    """Whether a parameter of that name can be set; if not, that is reported at `span`."""
    declaration = module.names.get(setting)
    if declaration is not None and declaration.kind == "given":
        return True
    if setting not in module.broken:
        sentence = f"there is no parameter `{setting}` to set"
        if declaration is not None and declaration.kind == "derived":
            sentence = f"`{setting}` is derived; only parameters under `given` can be set"
        near = nearest(setting, [name for name, each in module.names.items() if each.kind == "given"])
        problems.error("unknown-name", span, sentence, did_you_mean(near))
    return False


def _accept(settings: tuple[Setting, ...], module: Module, problems: Problems) -> dict[str, Setting]:
    return {each.name: each for each in settings if is_given(each.name, module, each.span, problems)}


def _given(declaration: Declaration, setting: Setting | None, scope: Scope) -> Value:
    """The value of a parameter, within what it may be. Raises Mistake."""
    head = declaration.line.head
    written = expression(head, "default")
    default = evaluate(written, scope)
    allowed, choices = _range(declaration, scope), _choices(declaration, scope)
    kind = allowed.low if allowed is not None else next(iter(choices), default)
    if isinstance(default, Quantity) and default.bare_zero:
        default = _same_kind(declaration.name, default, kind, written.span)
    _within_limits(declaration, default, allowed, choices, written.span)
    if setting is None:
        return default
    value = _same_kind(declaration.name, setting.value, default, setting.span)
    _within_limits(declaration, value, allowed, choices, setting.span)
    return value


def _same_kind(name: str, value: Value, default: Value, span: Span) -> Value:
    """The value, if it is of the default's kind; the bare 0 takes the default's dimension. Raises Mistake."""
    if isinstance(value, Quantity) and isinstance(default, Quantity):
        if value.dimension == default.dimension or default.bare_zero:
            return value
        if value.bare_zero:
            return Quantity(0.0, default.dimension)
    elif isinstance(value, Vector) and isinstance(default, Vector):
        if len(value.components) == len(default.components) and value.dimension == default.dimension:
            return value
        if len(value.components) == len(default.components) and not any(value.components):
            return Vector(value.components, default.dimension)
    elif type(value) is type(default):
        return value
    hint = ""
    if isinstance(value, Quantity) and isinstance(default, Quantity) and value.dimension == NUMBER:
        hint = f"give it a unit, such as `{spell(value)} {usual_unit(default.dimension)[0]}`"
    raise mistake("wrong-kind", span, f"`{name}` is {kind_of(default)}, found {kind_of(value)}", hint)


def _range(declaration: Declaration, scope: Scope) -> Interval | None:
    """What `range` allows. Raises Mistake."""
    written = optional(declaration.line.head, "range")
    allowed = evaluate(written, scope) if written is not None else None
    if written is None or isinstance(allowed, Interval):
        return allowed if isinstance(allowed, Interval) else None
    assert allowed is not None
    raise mistake("wrong-kind", written.span, f"expected a range such as `1 mm .. 5 mm`, found {kind_of(allowed)}")


def _choices(declaration: Declaration, scope: Scope) -> list[Value]:
    """What `one of` offers, of one kind. Raises Mistake."""
    written = declaration.line.head.get("choices")
    if not isinstance(written, tuple):
        return []
    choices: list[Value] = []
    for each in written:
        if not isinstance(each, (tree.Setting, tree.Parameter)):
            value = evaluate(each, scope)
            choices.append(value if not choices else _same_kind(declaration.name, value, choices[0], each.span))
    return choices


def _within_limits(
    declaration: Declaration, value: Value, allowed: Interval | None, choices: list[Value], span: Span
) -> None:
    """Raise Mistake for a value that the parameter may not have."""
    is_elsewhere = (span.file, span.line) != (declaration.span.file, declaration.span.line)
    related = (Related(declaration.span, "declared here"),) if is_elsewhere else ()
    if allowed is not None:
        if not isinstance(value, Quantity) or value.dimension != allowed.low.dimension:
            sentence = f"the range does not fit: `{declaration.name}` is {kind_of(value)}"
            raise mistake(
                "wrong-kind",
                span,
                f"{sentence}, its range runs over {dimension_name(allowed.low.dimension)}s",
                "",
                related,
            )
        if not allowed.low.value <= value.value <= allowed.high.value:
            sentence = f"`{declaration.name}` is {spell(value)}, outside its range {spell(allowed)}"
            raise mistake("out-of-range", span, sentence, "", related)
    if choices and not any(same(value, _same_kind(declaration.name, each, value, span), span) for each in choices):
        texts = [each for each in choices if isinstance(each, str)]
        near = nearest(value, texts) if isinstance(value, str) else ""
        sentence = f"`{declaration.name}` is {shown(value)}, expected one of {', '.join(map(shown, choices))}"
        raise mistake("out-of-range", span, sentence, f'did you mean "{near}"?' if near else "", related)
