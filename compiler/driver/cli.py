"""The command line: what may be said on it, and the exit code that answers."""

from __future__ import annotations

import argparse
import io
import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Literal, TypeAlias

from .crash import Trace, keep_fault
from .report import Report, StreamError, wants_colour, write_results
from .session import OutputError, UsageError

DONE, PROBLEMS, USAGE, OUR_FAULT, INTERRUPTED, READER_GONE = 0, 1, 2, 3, 130, 141

_RESOLUTIONS = (10.0, 4800.0)
_EXIT_CODES = """\
exit codes: 0 done; 1 problems in a scene, or a file that could not be written; 2 a command line that makes no sense;
3 a fault of platewright itself, with a folder that reproduces it"""
_CAUTION = """\
Figures and exports are not manufacturing drawings: check dimensions before making anything, and follow local codes
and licensed practice."""


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return the exit code. `arguments` follow the program's name, None for the process's own."""
    given = list(sys.argv[1:] if arguments is None else arguments)
    _speak_utf8()
    is_watched = sys.stderr.isatty() and os.environ.get("TERM") != "dumb"
    report = Report(sys.stdout, sys.stderr, wants_colour(sys.stderr, os.environ), is_watched)
    trace = Trace()
    try:
        options = _parser().parse_args(given)
        code: int = options.run(options, trace, report)
    except SystemExit as leaving:
        return leaving.code if isinstance(leaving.code, int) else USAGE
    except BrokenPipeError:
        return _leave_quietly()
    except KeyboardInterrupt:
        return INTERRUPTED
    except UsageError as fault:
        report.message(str(fault))
        return USAGE
    except StreamError as fault:
        _forget_results()
        report.message(str(fault))
        return PROBLEMS
    except OutputError as fault:
        report.message(str(fault))
        return PROBLEMS
    except Exception as fault:
        return _own_up(fault, given, trace, report)
    return code


def _speak_utf8() -> None:
    """Results are UTF-8 with line feeds everywhere; messages keep the terminal's encoding but never fail on it."""
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(encoding="utf-8", errors="surrogateescape", newline="\n")
    if isinstance(sys.stderr, io.TextIOWrapper):
        sys.stderr.reconfigure(errors="backslashreplace")


def _leave_quietly() -> int:
    """The reader of a stream has gone."""
    _forget_results()
    return READER_GONE


def _forget_results() -> None:
    """Give what is left of the results, which the interpreter flushes at its end, somewhere to go."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, sys.stdout.fileno())


def _own_up(fault: Exception, arguments: Sequence[str], trace: Trace, report: Report) -> int:
    import tempfile

    folder = keep_fault(trace, fault, arguments, Path(tempfile.gettempdir()))
    report.message(f"a fault of platewright while {trace.stage}: {type(fault).__name__}: {fault}")
    if folder is None:
        report.message("no folder could be written that reproduces it")
    else:
        report.message(f"what reproduces it is in {folder}; please send that folder with your report")
    return OUR_FAULT


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="platewright",
        description="Draws the three-dimensional figures of a document from scene files.",
        epilog=f"{_EXIT_CODES}\n\n{_CAUTION}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action=_Version, help="print the version and leave")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    _add_draw(commands)
    _add_check(commands)
    _add_format(commands)
    _add_export(commands)
    _add_list(commands)
    _add_warm_up(commands)
    return parser


_Commands: TypeAlias = "argparse._SubParsersAction[argparse.ArgumentParser]"


class _Version(argparse.Action):
    """Looks the version up only when asked, which spares every other run the time."""

    def __init__(self, option_strings: Sequence[str], dest: str, help: str | None = None) -> None:
        super().__init__(option_strings, argparse.SUPPRESS, nargs=0, help=help)

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> None:
        from importlib.metadata import version

        write_results(sys.stdout, f"platewright {version('platewright')}\n")
        parser.exit()


class _Once(argparse.Action):
    """Refuses an option said twice, of which one would be passed over without a word."""

    def __call__(self, parser: argparse.ArgumentParser, options: argparse.Namespace, value: object, *_: object) -> None:
        if getattr(options, self.dest) is not None:
            parser.error(f"argument {self.option_strings[0]}: may be given only once")
        setattr(options, self.dest, value)


def _command(
    commands: _Commands, name: str, does: str, run: Callable[[argparse.Namespace, Trace, Report], int]
) -> argparse.ArgumentParser:
    sentence = f"{does[0].upper()}{does[1:]}."
    parser: argparse.ArgumentParser = commands.add_parser(name, help=does, description=sentence, allow_abbrev=False)
    parser.set_defaults(run=run)
    return parser


def _add_scene(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("scene", metavar="SCENE", type=Path, help="the scene file")
    project = "the folder that `see` and tables may not leave (the scene's own)"
    parser.add_argument("--project", metavar="DIR", type=Path, help=project)


def _add_settings(parser: argparse.ArgumentParser) -> None:
    settings = "give a parameter another value, as in --set 'rim=160 mm'; may be repeated"
    parser.add_argument("--set", metavar="NAME=VALUE", type=_setting, action="append", default=[], help=settings)


def _add_draw(commands: _Commands) -> None:
    parser = _command(commands, "draw", "draw the figures of a scene", _run_draw)
    _add_scene(parser)
    figure = "draw this figure only; may be repeated"
    parser.add_argument("--figure", metavar="NAME", action="append", default=[], help=figure)
    choice = parser.add_mutually_exclusive_group()
    variant = "draw this variant; may be repeated"
    choice.add_argument("--variant", metavar="NAME", action="append", default=[], help=variant)
    everyone = "draw every row of `variants`, each in a folder of its name (the defaults are not drawn)"
    choice.add_argument("--all-variants", action="store_true", help=everyone)
    _add_settings(parser)
    kinds = "the kind of file, instead of those the figure states; may be repeated"
    parser.add_argument("--kind", choices=("svg", "pdf", "eps", "png", "tiff"), action="append", default=[], help=kinds)
    parser.add_argument("--out", metavar="DIR", type=Path, help="the folder to write to (`figures` beside the scene)")
    resolution = "dots per inch, instead of what the figure states"
    parser.add_argument("--resolution", metavar="DPI", type=_resolution, help=resolution)
    record = "write FIGURE.record.json as well: the view, and how much of each part shows"
    parser.add_argument("--record", action="store_true", help=record)


def _run_draw(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .draw import Wanted, draw

    wanted = Wanted(
        scene=options.scene,
        project=options.project,
        figures=tuple(options.figure),
        variants=tuple(options.variant),
        all_variants=options.all_variants,
        settings=tuple(options.set),
        kinds=tuple(options.kind),
        out=options.out,
        resolution=options.resolution,
        record=options.record,
    )
    return draw(wanted, trace, report)


def _add_check(commands: _Commands) -> None:
    parser = _command(commands, "check", "check a scene with its defaults and every variant", _run_check)
    _add_scene(parser)
    parser.add_argument("--figures", action="store_true", help="lay out every figure as well")
    form = parser.add_mutually_exclusive_group()
    form.add_argument("--json", action="store_true", help="print the problems as JSON")
    form.add_argument("--sarif", action="store_true", help="print the problems as SARIF 2.1.0")
    stages = ("tree", "graph", "triangles")
    form.add_argument("--dump", choices=stages, help="print one stage of the work as text")


def _run_check(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .commands import check

    form: Literal["text", "json", "sarif"] = "json" if options.json else "sarif" if options.sarif else "text"
    return check(options.scene, options.project, options.figures, form, options.dump, trace, report)


def _add_format(commands: _Commands) -> None:
    parser = _command(commands, "format", "put scene files into the canonical layout", _run_format)
    parser.add_argument("scenes", metavar="SCENE", type=Path, nargs="+", help="the scene files")
    parser.add_argument("--check", action="store_true", help="change nothing; name the files that would change")


def _run_format(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .commands import reformat

    return reformat(options.scenes, options.check, trace, report)


def _add_export(commands: _Commands) -> None:
    does = "write the triangles of a part or assembly, millimetres, to CSV, STL, PLY, OBJ or (in metres) GLB"
    parser = _command(commands, "export", does, _run_export)
    parser.epilog = _CAUTION
    _add_scene(parser)
    of = "the part path, as `list` shows it"
    parser.add_argument("--of", metavar="PATH", action=_Once, required=True, help=of)
    to = "the file; its suffix says the kind: .csv .stl .ply .obj .glb"
    parser.add_argument("--to", metavar="FILE", type=Path, action=_Once, required=True, help=to)
    tolerance = "the largest distance of a triangle from the true surface, as in --tolerance 0.05mm"
    parser.add_argument("--tolerance", metavar="LENGTH", action=_Once, help=tolerance)
    parser.add_argument("--variant", metavar="NAME", action=_Once, help="export from this variant")
    _add_settings(parser)


def _run_export(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .commands import ExportWanted, export

    tolerance = None if options.tolerance is None else _length(options.tolerance)
    place = (options.scene, options.project, options.of, options.to)
    return export(ExportWanted(*place, tolerance, options.variant, tuple(options.set)), trace, report)


def _add_list(commands: _Commands) -> None:
    does = "list parameters, parts with their counts, sizes and volumes, figures and variants"
    parser = _command(commands, "list", does, _run_list)
    _add_scene(parser)
    parser.add_argument("--json", action="store_true", help="print the list as JSON")


def _run_list(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .commands import show_list

    return show_list(options.scene, options.project, options.json, trace, report)


def _add_warm_up(commands: _Commands) -> None:
    does = "compile the drawing kernels once, so that the first figure does not wait for them"
    _command(commands, "warm-up", does, _run_warm_up)


def _run_warm_up(options: argparse.Namespace, trace: Trace, report: Report) -> int:
    from .warm import warm_up

    return warm_up(trace, report)


def _setting(text: str) -> tuple[str, str]:
    name, equals, value = text.partition("=")
    if not equals or not name.strip() or not value.strip():
        raise argparse.ArgumentTypeError(f"{text!r} is not NAME=VALUE, as in 'rim=160 mm'")
    return name.strip(), value.strip()


def _resolution(text: str) -> float:
    low, high = _RESOLUTIONS
    try:
        resolution = float(text)
    except ValueError:
        resolution = 0.0
    if not low <= resolution <= high:
        raise argparse.ArgumentTypeError(f"{text!r} is not a resolution from {low:g} to {high:g} dots per inch")
    return resolution


def _length(text: str) -> float:
    """A positive length in mm, written as in a scene. Raises UsageError."""
    from platewright.lang import tree
    from platewright.lang.reader import read_value
    from platewright.lang.units import LENGTH, quantity

    value, _ = read_value("--tolerance", text)
    if isinstance(value, tree.Number) and value.unit:
        length, dimension = quantity(value.text, value.unit)
        if dimension == LENGTH and length > 0:
            return length
    raise UsageError(f"--tolerance {text} is not a length above zero; write it with its unit, as in 0.05mm")
