"""Variants: named settings of parameters, written on lines or taken from a table."""

from __future__ import annotations

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.source import Span

from .expressions import evaluate
from .mistakes import Problems
from .modules import Declaration, Module, Modules
from .parameters import Setting, is_given, outermost
from .project import Files, beside
from .readings import name, optional, settings
from .tables import Table


class Variant(Struct, frozen=True):
    """One named group of settings, and the `variants` declaration it stands in."""

    name: str
    set_name: str
    span: Span
    settings: tuple[Setting, ...]


def read_variants(files: Files, modules: Modules, problems: Problems) -> tuple[Variant, ...]:
    """The variants of the main file, in the order of the text. Settings of what is no parameter are left out."""
    module = modules[files.main]
    variants: list[Variant] = []
    for declaration in module.variants.values():
        table = _table(declaration.line, files)
        if table is not None:
            variants += _from_table(table, declaration.name, module, problems)
        for line in declaration.line.lines:
            variants.append(_from_line(line, declaration, module, problems))
    seen: dict[str, Variant] = {}
    for variant in variants:
        if variant.name in seen:
            related = (Related(seen[variant.name].span, "the first of them"),)
            sentence = f"two variants are called `{variant.name}`"
            problems.error("duplicate-name", variant.span, sentence, "rename one", related)
        seen.setdefault(variant.name, variant)
    return tuple(variants)


def _table(line: tree.Line, files: Files) -> Table | None:
    written = optional(line.head, "table")
    if not isinstance(written, tree.Text):
        return None
    target = beside(files.main, "".join(part for part in written.parts if isinstance(part, str)))
    return files.tables.get(target) if target else None


def _from_table(table: Table, set_name: str, module: Module, problems: Problems) -> list[Variant]:
    columns = [
        (number, column)
        for number, column in enumerate(table.columns)
        if number and is_given(column, module, table.header[number], problems)
    ]
    variants = []
    for label, row, spans in zip(table.labels, table.rows, table.cell_spans, strict=True):
        chosen = []
        for number, column in columns:
            value = row[number]
            if value is not None:
                chosen.append(Setting(column, value, spans[number]))
        variants.append(Variant(label, set_name, spans[0], tuple(chosen)))
    return variants


def _from_line(line: tree.Line, declaration: Declaration, module: Module, problems: Problems) -> Variant:
    chosen: dict[str, Setting] = {}
    for setting in settings(line.head):
        if not is_given(setting.name, module, setting.name_span, problems):
            continue
        if setting.name in chosen:
            related = (Related(chosen[setting.name].span, "set here first"),)
            problems.error("said-twice", setting.span, f"`{setting.name}` is set twice", "leave one out", related)
            continue
        with problems.collecting():
            value = evaluate(setting.value, outermost())
            chosen[setting.name] = Setting(setting.name, value, setting.span)
    own = name(line.head)
    return Variant(own.text, declaration.name, own.span, tuple(chosen.values()))
