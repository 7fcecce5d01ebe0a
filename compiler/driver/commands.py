"""The commands that draw nothing: check, format, export and list."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from platewright.compiler.limits import FILE_BYTES
from platewright.lang.problems import Problem, Severity, is_error
from platewright.lang.source import Span

from . import files, names, session
from .crash import Trace
from .meshes import KeptMeshes
from .report import Report
from .session import Findings, OutputError, UsageError

if TYPE_CHECKING:
    from platewright.compiler.scene import Model, Project, Setting, Variant

Stage = Literal["tree", "graph", "triangles"]
STAGES: tuple[Stage, ...] = ("tree", "graph", "triangles")
EXPORTS = ("csv", "stl", "ply", "obj", "glb")
"""Kinds of triangle list, each the suffix of its file."""

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
    findings, mesher = Findings(), KeptMeshes()
    project = session.open_project(scene, project_folder, trace, findings)
    dumped = ""
    if project is not None:
        findings.add(names.problems(project.variants, "variant"))
        for variant in (None, *project.variants):
            model = _check_variant(project, variant, figures, mesher, trace, findings)
            if variant is None and model is not None and stage is not None:
                dumped = _dump(project, model, stage, mesher, trace, findings)
    problems = findings.worded()
    texts = session.texts(project, trace)
    if form == "text":
        report.problems(problems, texts)
    else:
        report.document(_for_machines(problems, form))
    if dumped:
        report.document(dumped)
    return 1 if findings.has_errors else 0


def _check_variant(
    project: Project, variant: Variant | None, figures: bool, mesher: KeptMeshes, trace: Trace, findings: Findings
) -> Model | None:
    from platewright.compiler.scene import judge, plan

    model, problems = session.build_model(project, variant, (), trace)
    findings.add(problems, variant)
    if model is None:
        return None
    findings.add(names.problems(model.figures, "figure"), variant)
    trace.stage = f"judging {session.title(variant)}"
    findings.add(judge(model, mesher), variant)
    bad = {problem.within for problem in problems if is_error(problem)}
    for figure in model.figures if figures else ():
        if figure.name not in bad:
            trace.stage = f"laying out figure {figure.name} of {session.title(variant)}"
            findings.add(plan(model, figure.name, mesher)[1], variant)
    return model


def _dump(project: Project, model: Model, stage: Stage, mesher: KeptMeshes, trace: Trace, findings: Findings) -> str:
    from platewright.compiler.scene import dump

    trace.stage = f"dumping the {stage}"
    dumped, problems = dump(project, model, stage, mesher)
    findings.add(problems)
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
    findings = Findings()
    content: dict[Path, bytes] | None = None
    project = session.open_project(wanted.scene, wanted.project, trace, findings)
    if project is not None:
        names_given = () if wanted.variant is None else (wanted.variant,)
        (variant,) = session.chosen_variants(project, names_given, False)
        model, problems = session.build_model(project, variant, wanted.settings, trace)
        findings.add(problems, variant)
        if model is not None:
            content = _exported(model, wanted, kind, trace, findings)
    report.problems(findings.worded(), session.texts(project, trace, wanted.settings) | {"--of": wanted.path})
    if content is None:
        return 1
    _write(content)
    for path in content:
        report.result(str(path))
    return 0


def _exported(
    model: Model, wanted: ExportWanted, kind: str, trace: Trace, findings: Findings
) -> dict[Path, bytes] | None:
    from platewright.backend.write import exports
    from platewright.compiler.scene import geometry

    trace.stage = f"exporting {wanted.path}"
    exported, problems = geometry(model, wanted.path, KeptMeshes(), wanted.tolerance)
    findings.add(problems)
    if exported is None or any(map(is_error, problems)):
        return None
    written = exports.export(exported.geometry, exported.materials, kind, exported.nodes, wanted.to.stem)
    beside = {wanted.to.with_suffix(f".{suffix}"): written[suffix] for suffix in written if suffix != kind}
    return {wanted.to: written[kind]} | beside


def show_list(scene: Path, project_folder: Path | None, is_json: bool, trace: Trace, report: Report) -> int:
    """List what a scene holds: parameters, parts with sizes, figures, variants. The exit code, 1 on errors."""
    from . import contents

    findings = Findings()
    project = session.open_project(scene, project_folder, trace, findings)
    listed = None
    if project is not None:
        model, problems = session.build_model(project, None, (), trace)
        findings.add(problems)
        if model is not None:
            from platewright.compiler.scene import listing

            trace.stage = "listing the scene"
            listed, problems = listing(model, project, KeptMeshes())
            findings.add(problems)
    report.problems(findings.worded(), session.texts(project, trace))
    if listed is not None:
        report.document(contents.as_json(listed) if is_json else contents.as_text(listed))
    return 1 if findings.has_errors else 0


def _write(content: dict[Path, bytes]) -> None:
    try:
        files.write_all(content)
    except OSError as fault:
        where = fault.filename or ", ".join(map(str, content))
        raise OutputError(f"cannot write {where}: {fault.strerror or fault}") from fault
