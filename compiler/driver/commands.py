"""The commands that draw nothing: check, format, export and list."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from platewright.compiler.limits import FILE_BYTES
from platewright.lang.problems import Problem, Severity, is_error
from platewright.lang.source import Span

from . import files
from .crash import Trace
from .report import Report
from .session import OutputError, Session, UsageError, chosen_variants, open_session, title

if TYPE_CHECKING:
    from platewright.compiler.scene import Model, Setting, Variant

Stage = Literal["tree", "graph", "triangles"]
STAGES: tuple[Stage, ...] = ("tree", "graph", "triangles")
EXPORTS = ("csv", "stl", "ply", "obj", "glb")
"""Kinds of triangle list, each the suffix of its file."""

_OF_FIGURES = ("cropped", "page-half-empty")
"""Codes of warnings that come only from laying a figure out."""

_NOT_READ = {
    "missing": "there is no such file",
    "not a file": "it is not a regular file",
    "too large": f"it is over the limit of {FILE_BYTES:,} bytes",
    "unreadable": "it cannot be read",
    "outside": "it lies outside the project folder",
}


def check(
    scene: Path,
    project_folder: Path | None,
    figures: bool,
    form: Literal["text", "json", "sarif"],
    stage: Stage | None,
    trace: Trace,
    report: Report,
) -> int:
    """Check a scene with its defaults and every variant; with `figures`, that each figure can be laid out as well.

    Writes problems as text to the messages, in another form to the results; a dump goes to the results. The exit
    code: 1 with any error, else 0.
    """
    session = open_session(scene, project_folder, trace)
    model = _check_variant(session, None, figures)
    for variant in session.project.variants if session.project is not None and model is not None else ():
        _check_variant(session, variant, figures)
    if session.project is not None and not session.findings.has_errors:
        _report_unused(session, figures)
    dumped = _dump(session, model, stage) if model is not None and stage is not None else ""
    problems = session.findings.worded()
    if form == "text":
        report.problems(problems, session.texts())
    else:
        report.document(_for_machines(problems, form))
    if dumped:
        report.document(dumped)
    return 1 if session.findings.has_errors else 0


def _check_variant(session: Session, variant: Variant | None, figures: bool) -> Model | None:
    from platewright.compiler.scene import judge, plan

    model, is_sound = session.attempt(variant)
    if model is None:
        return None
    session.trace.stage = f"judging {title(variant)}"
    session.findings.add(judge(model, session.mesher), variant)
    if not is_sound:
        return None
    bad = session.bad_figures(model)
    for figure in model.figures if figures else ():
        if figure.name not in bad:
            session.trace.stage = f"laying out figure {figure.name} of {title(variant)}"
            session.findings.add(plan(model, figure.name, session.mesher)[1], variant)
    return model


def _report_unused(session: Session, figures: bool) -> None:
    """Warn of what is accepted and never came up; of figures' warnings only where figures were laid out."""
    from platewright.compiler.scene import unused

    wanted = [each for each in session.findings.acceptances if figures or not (each.figure or each.code in _OF_FIGURES)]
    session.findings.add(unused(wanted, session.findings.used))


def _dump(session: Session, model: Model, stage: Stage) -> str:
    from platewright.compiler.scene import dump

    if session.project is None:
        return ""
    session.trace.stage = f"dumping the {stage}"
    dumped, problems = dump(session.project, model, stage, session.mesher)
    session.findings.add(problems)
    return dumped


def _for_machines(problems: Sequence[Problem], form: Literal["json", "sarif"]) -> str:
    from importlib.metadata import version

    from platewright.lang.render import render_json, render_sarif

    return render_json(problems) if form == "json" else render_sarif(problems, version("platewright"))


def reformat(scenes: Iterable[Path], is_check: bool, trace: Trace, report: Report) -> int:
    """Put files into the canonical layout, or with `is_check` only name those that are not in it.

    Names of files changed, or to be changed, are results. The exit code: 1 if a file could not be formatted or, with
    `is_check`, would change; else 0.
    """
    outcomes = [_reformat_one(scene, is_check, trace, report) for scene in scenes]
    return 1 if any(outcomes) else 0


def _reformat_one(scene: Path, is_check: bool, trace: Trace, report: Report) -> bool:
    """Format one file. Whether it makes the exit code 1."""
    from platewright.lang.printer import format_text

    real = scene.resolve()
    content = files.read_regular(real)
    if isinstance(content, str):
        raise UsageError(f"cannot format {scene}: {_NOT_READ[content]}")
    trace.sources[scene.name] = content
    trace.copies[str(scene)] = scene.name
    trace.stage = f"formatting {scene}"
    text = content.decode("utf-8", "replace")
    formatted, problems = (
        format_text(str(scene), text) if text.encode() == content else (None, (_not_utf8(scene, content),))
    )
    report.problems(problems, {str(scene): text})
    if formatted is None:
        return True
    if formatted.encode() == content:
        return False
    if not is_check:
        _write({real: formatted.encode()})
    report.result(str(scene))
    return is_check


def _not_utf8(scene: Path, content: bytes) -> Problem:
    line = len(content.decode("utf-8", "replace").partition("\ufffd")[0].split("\n"))
    span = Span(str(scene), line, 1, line, 1)
    return Problem("not-utf-8", Severity.ERROR, span, "this file is not UTF-8", "save the file as UTF-8")


@dataclass(frozen=True, slots=True)
class ExportWanted:
    """What an export is asked for. `path` is the part path, `tolerance` the chord error in mm."""

    scene: Path
    project: Path | None
    path: str
    to: Path
    tolerance: float | None
    variant: str | None
    settings: tuple[Setting, ...]


def export(wanted: ExportWanted, trace: Trace, report: Report) -> int:
    """Write the triangles of a part or assembly. The exit code: 1 if a problem forbids it, else 0.

    Raises UsageError for a suffix or a name that is not known, OutputError if a file cannot be written.
    """
    kind = wanted.to.suffix[1:].lower()
    if kind not in EXPORTS:
        raise UsageError(f"cannot tell what kind of file {wanted.to} is to be; give it one of .{', .'.join(EXPORTS)}")
    trace.beside, trace.overrides = wanted.to.absolute().parent, ("--to", wanted.to.name)
    session = open_session(wanted.scene, wanted.project, trace)
    content: dict[Path, bytes] | None = None
    if session.project is not None:
        (variant,) = chosen_variants(session.project, () if wanted.variant is None else (wanted.variant,), False)
        model = session.build(variant, wanted.settings)
        content = None if model is None else _exported(model, wanted, kind, session)
    report.problems(session.findings.worded(), session.texts(wanted.settings) | {"--of": wanted.path})
    if content is None:
        return 1
    _write(content)
    for path in content:
        report.result(str(path))
    return 0


def _exported(model: Model, wanted: ExportWanted, kind: str, session: Session) -> dict[Path, bytes] | None:
    from platewright.backend.write import exports
    from platewright.compiler.scene import geometry

    session.trace.stage = f"exporting {wanted.path}"
    exported, problems = geometry(model, wanted.path, session.mesher, wanted.tolerance)
    session.findings.add(problems)
    if exported is None or any(map(is_error, problems)):
        return None
    written = exports.export(exported.geometry, exported.materials, kind, exported.nodes, wanted.to.stem)
    beside = {wanted.to.with_suffix(f".{suffix}"): written[suffix] for suffix in written if suffix != kind}
    return {wanted.to: written[kind]} | beside


def show_list(scene: Path, project_folder: Path | None, is_json: bool, trace: Trace, report: Report) -> int:
    """List what a scene holds: parameters, parts with sizes, figures, variants. The exit code, 1 on errors."""
    from . import contents

    session = open_session(scene, project_folder, trace)
    model, listed = session.build(), None
    if model is not None and session.project is not None:
        from platewright.compiler.scene import listing

        trace.stage = "listing the scene"
        listed, problems = listing(model, session.project, session.mesher)
        session.findings.add(problems)
    report.problems(session.findings.worded(), session.texts())
    if listed is not None:
        report.document(contents.as_json(listed) if is_json else contents.as_text(listed))
    return 1 if session.findings.has_errors else 0


def _write(content: dict[Path, bytes]) -> None:
    try:
        files.write_all(content)
    except OSError as fault:
        where = fault.filename or ", ".join(map(str, content))
        raise OutputError(f"cannot write {where}: {fault.strerror or fault}") from fault
