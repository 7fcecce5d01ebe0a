"""The draw command: figures times variants, each written whole or not at all."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from platewright.lang.problems import Problem, Severity, is_error

from . import files, warm
from .crash import Trace
from .report import Report, Steps
from .session import Session, chosen_figures, chosen_variants, open_session, title

if TYPE_CHECKING:
    from platewright.compiler.scene import Model, Setting, Variant

MOST_LINES = 1_000_000
"""Lines a drawing may be made of without a warning, hidden ones with them."""


@dataclass(frozen=True, slots=True)
class Wanted:
    """What a draw is asked for. `out` None stands for the folder `figures` beside the scene."""

    scene: Path
    project: Path | None = None
    figures: tuple[str, ...] = ()
    variants: tuple[str, ...] = ()
    all_variants: bool = False
    settings: tuple[Setting, ...] = ()
    kinds: tuple[str, ...] = ()
    out: Path | None = None
    resolution: float | None = None
    record: bool = False


@dataclass(slots=True)
class _Run:
    wanted: Wanted
    out: Path
    session: Session
    report: Report
    failed: list[str] = field(default_factory=list)
    n_shown: int = 0

    def show_news(self) -> None:
        """Print the problems that have come since the last time."""
        findings = self.session.findings
        self.report.problems(findings.worded(self.n_shown), self.session.texts(self.wanted.settings))
        self.n_shown = len(findings.found)


def draw(wanted: Wanted, trace: Trace, report: Report) -> int:
    """Draw all figures wanted of all variants wanted. The exit code: 1 if any is not written, else 0.

    Raises UsageError for names the scene does not have.
    """
    out = wanted.out if wanted.out is not None else wanted.scene.parent / "figures"
    trace.beside, trace.overrides = out.absolute().parent, ("--out", "figures")
    session = open_session(wanted.scene, wanted.project, trace)
    run = _Run(wanted, out, session, report)
    if session.project is None:
        run.show_news()
        return 1
    figures = chosen_figures(session.project, wanted.figures)
    variants = chosen_variants(session.project, wanted.variants, wanted.all_variants)
    with report.progress(max(1, len(figures)) * len(variants)) as steps:
        for variant in variants:
            _draw_variant(variant, figures, run, steps)
    if run.failed:
        report.message(f"not written: {', '.join(run.failed)}")
    stops = session.findings.stops(figures) if wanted.figures else session.findings.has_errors
    return 1 if run.failed or stops else 0


def _draw_variant(variant: Variant | None, figures: tuple[str, ...], run: _Run, steps: Steps) -> None:
    """All figures of one variant. A problem that concerns all of it keeps every figure from being written."""
    model = run.session.build(variant, run.wanted.settings)
    run.show_news()
    if model is None:
        run.failed.append(title(variant))
        return
    if not model.figures:
        run.report.message(
            "there is nothing to draw: the scene has no figure, and no one thing that nothing else places"
        )
        run.failed.append(title(variant))
    bad = run.session.bad_figures(model)
    for figure in figures or [figure.name for figure in model.figures]:
        unit = figure if variant is None else f"{variant.name}/{figure}"
        steps.begin(unit)
        run.session.trace.stage = f"drawing {unit}"
        content = None if figure in bad else _unit(model, figure, variant, run, steps)
        run.show_news()
        if content is None or not _write(content, run):
            run.failed.append(unit)


def _unit(model: Model, figure: str, variant: Variant | None, run: _Run, steps: Steps) -> dict[Path, bytes] | None:
    """The files of one figure of one variant, all in memory; None if a problem forbids them."""
    from platewright.backend import sheet
    from platewright.backend.write.record import record_bytes
    from platewright.compiler.scene import plan

    job, problems = plan(
        model, figure, run.session.mesher, resolution=run.wanted.resolution, measures=run.wanted.record
    )
    run.session.findings.add(problems, variant)
    if job is None or any(map(is_error, problems)):
        return None
    kinds = run.wanted.kinds or job.sheet.files
    with warm.compiling_told(run.report):
        drawn = sheet.draw(job, kinds, progress=steps.share)
    content = {f"{figure}.{kind}": sheet.encode(drawn, job, kind) for kind in dict.fromkeys(kinds)}
    if run.wanted.record:
        content[f"{figure}.record.json"] = record_bytes(job, drawn.measures, sheet.line_list(drawn, job))
    if drawn.n_lines > MOST_LINES:
        run.session.findings.add((_too_many(model, figure, drawn.n_lines),), variant)
    if drawn.thin:
        run.session.findings.add((_too_thin(model, figure, drawn.thin, job.sheet.page.resolution),), variant)
    folder = run.out if variant is None else run.out / variant.name
    return {folder / name: encoded for name, encoded in content.items()}


def _too_many(model: Model, figure: str, n_lines: int) -> Problem:
    """A warning that a drawing has more lines than a page can show."""
    span = next(each.span for each in model.figures if each.name == figure)
    sentence = f"{n_lines:,} lines may be drawn in this figure, more than {MOST_LINES:,}"
    return Problem("many-lines", Severity.WARNING, span, sentence, "draw less of it, or draw it as tone", (), figure)


def _too_thin(model: Model, figure: str, thin: tuple[tuple[float, float], ...], resolution: float) -> Problem:
    """A warning that lines of a picture in two values are too few pixels wide to keep their weight."""
    span = next(each.span for each in model.figures if each.name == figure)
    width, n_pixels = thin[0]
    sentence = f"at {resolution:g} pixels to the inch a line of {width:g} mm is {n_pixels:.1f} pixels wide in the TIFF"
    hint = f"{4.0 * 25.4 / width:.0f} or more keep four pixels"
    return Problem("thin-lines", Severity.WARNING, span, sentence, hint, (), figure)


def _write(content: Mapping[Path, bytes], run: _Run) -> bool:
    try:
        files.write_all(content)
    except OSError as fault:
        run.report.message_once(f"cannot write {fault.filename or run.out}: {fault.strerror or fault}")
        return False
    for path in content:
        run.report.result(str(path))
    return True
