"""The command line as its users meet it: exit codes, streams, files, faults."""

from __future__ import annotations

import io
import json
import os
import re
import shlex
import signal
import subprocess
import sys
from pathlib import Path

import pytest
from platewright.compiler import scene
from platewright.compiler.driver.cli import main
from platewright.compiler.driver.report import Report, wants_colour
from platewright.compiler.limits import FILE_BYTES

DRUM = """\
platewright 1

given
    flange = 84 mm range 70 mm .. 120 mm
    depth = 50 mm range 30 mm .. 80 mm

part can
    add cylinder diameter flange - 24 mm length depth
    add cylinder diameter flange length 5 mm at (0, 0, depth - 5 mm)
    cut cylinder diameter flange - 30 mm length depth - 3 mm at (0, 0, 3 mm)

part lid
    add cylinder diameter flange length 5 mm

assembly drum
    place can
    place lid at (0, 0, depth)

viewpoint near
    eye (200 mm, -300 mm, 200 mm) toward (0, 0, depth / 2)

figure overview
    show drum
    drawn as tone
    width 20 mm

figure close
    show drum from near
    drawn as survey part
    width 20 mm

variants sizes
    small flange = 72 mm
    large flange = 110 mm, depth = 72 mm
"""
NO_NUMBA = "import sys; from platewright.compiler.driver.cli import main; code = main(sys.argv[1:]); "


@pytest.fixture
def drum(tmp_path: Path) -> Path:
    path = tmp_path / "drum.plate"
    path.write_text(DRUM, encoding="utf-8")
    return path


def changed(path: Path, *changes: tuple[str, str]) -> Path:
    """The scene with texts replaced, each of which must be there."""
    text = path.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    path.write_text(text, encoding="utf-8")
    return path


def files_below(folder: Path) -> list[str]:
    return sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file())


def process(*arguments: str, **options: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "platewright.compiler", *arguments]
    return subprocess.run(command, capture_output=True, text=True, timeout=120, check=False, **options)  # type: ignore[call-overload,no-any-return]


# --- draw


def test_draw_writes_every_figure_and_prints_the_paths(
    drum: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(drum.parent)
    assert main(["draw", "drum.plate"]) == 0
    out, _ = capsys.readouterr()
    assert out.splitlines() == ["figures/overview.png", "figures/close.png"]
    assert files_below(drum.parent) == ["drum.plate", "figures/close.png", "figures/overview.png"]


def test_variants_have_folders_and_kinds_and_records_are_chosen(drum: Path, tmp_path: Path) -> None:
    out = tmp_path / "deliver"
    wanted = ["--figure", "overview", "--kind", "png", "--kind", "tiff", "--record", "--resolution", "100"]
    assert main(["draw", str(drum), "--all-variants", "--out", str(out), *wanted]) == 0
    names = ["overview.png", "overview.record.json", "overview.tiff"]
    assert files_below(out) == [f"{variant}/{name}" for variant in ("large", "small") for name in names]
    record = json.loads((out / "large" / "overview.record.json").read_text(encoding="utf-8"))
    assert record["figure"] == "overview"
    assert record["page"]["width_mm"] == 20
    assert record["page"]["columns"] == 79  # 20 mm at 100 dpi: 20 / 25.4 * 100 = 78.74


def test_set_reaches_the_model_as_a_variant_does(drum: Path, tmp_path: Path) -> None:
    a, b = tmp_path / "a", tmp_path / "b"
    assert main(["draw", str(drum), "--figure", "overview", "--variant", "small", "--out", str(a)]) == 0
    assert main(["draw", str(drum), "--figure", "overview", "--set", "flange=72 mm", "--out", str(b)]) == 0
    assert main(["draw", str(drum), "--figure", "overview", "--out", str(tmp_path / "c")]) == 0
    small = (a / "small" / "overview.png").read_bytes()
    assert small == (b / "overview.png").read_bytes()
    assert small != (tmp_path / "c" / "overview.png").read_bytes()


def test_a_setting_out_of_range_writes_nothing(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", str(drum), "--set", "flange=300 mm"]) == 1
    err = capsys.readouterr().err
    assert "120 mm" in err and " 1 | 300 mm\n" in err
    assert files_below(drum.parent) == ["drum.plate"]


def test_an_error_in_the_scene_writes_nothing(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", str(changed(drum, ("place lid", "place ild")))]) == 1
    out, err = capsys.readouterr()
    assert out == ""
    assert "drum.plate:17:" in err and "lid" in err
    assert files_below(drum.parent) == ["drum.plate"]


def test_a_bad_figure_is_named_and_the_others_are_written(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed(drum, ("eye (200 mm, -300 mm, 200 mm) toward", "eye (0, 0, depth / 2) toward"))
    assert main(["draw", str(drum)]) == 1
    out, err = capsys.readouterr()
    assert [Path(line).name for line in out.splitlines()] == ["overview.png"]
    assert "not written: close" in err
    assert files_below(drum.parent) == ["drum.plate", "figures/overview.png"]


@pytest.mark.parametrize("line", ["scale bar 20 mm", "items"])
def test_what_is_not_drawn_yet_in_a_figure_stops_that_figure_only(
    drum: Path, line: str, capsys: pytest.CaptureFixture[str]
) -> None:
    changed(drum, ("drawn as survey part\n    width 20 mm", f"{line}\n    width 20 mm"))
    assert main(["draw", str(drum)]) == 1
    out, err = capsys.readouterr()
    assert [Path(line).name for line in out.splitlines()] == ["overview.png"]
    assert "[not-drawn-yet]" in err and "in the figure close" in err and err.endswith("not written: close\n")
    assert main(["draw", str(drum), "--figure", "overview", "--out", str(drum.parent / "one")]) == 0
    assert main(["draw", str(drum), "--figure", "close", "--out", str(drum.parent / "two")]) == 1
    assert files_below(drum.parent) == ["drum.plate", "figures/overview.png", "one/overview.png"]
    assert main(["check", str(drum), "--figures"]) == 1


def test_a_figure_of_a_file_seen_stops_none_of_the_scene(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    scene_file = drum.parent / "more.plate"
    seeing = 'platewright 1\n\nsee "drum.plate" as d\n\nfigure close\n    show d.drum\n    width 20 mm\n'
    scene_file.write_text(seeing, encoding="utf-8")
    changed(drum, ("drawn as survey part", "items"))
    assert main(["draw", str(scene_file)]) == 1
    out, err = capsys.readouterr()
    assert [Path(line).name for line in out.splitlines()] == ["close.png"]
    assert "[not-drawn-yet]" in err and "not written" not in err


def test_a_bad_variant_is_named_and_the_others_are_written(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed(drum, ("small flange = 72 mm", "small flange = 72 mm\n    tiny flange = 12 mm"))
    assert main(["draw", str(drum), "--all-variants", "--figure", "overview"]) == 1
    assert "tiny" in capsys.readouterr().err
    assert files_below(drum.parent / "figures") == ["large/overview.png", "small/overview.png"]


def test_a_figure_that_cannot_be_written_leaves_the_rest(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (drum.parent / "figures" / "close.png").mkdir(parents=True)
    assert main(["draw", str(drum), "--kind", "png", "--kind", "tiff"]) == 1
    assert "cannot write" in capsys.readouterr().err
    assert files_below(drum.parent / "figures") == ["overview.png", "overview.tiff"]


def test_an_earlier_picture_outlives_a_failing_write(
    drum: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["draw", str(drum), "--figure", "overview"]) == 0
    before = (drum.parent / "figures" / "overview.png").read_bytes()

    def no_space(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", no_space)
    changed(drum, ("length 5 mm", "length 9 mm"))
    assert main(["draw", str(drum), "--figure", "overview"]) == 1
    assert "No space left on device" in capsys.readouterr().err
    assert files_below(drum.parent / "figures") == ["overview.png"]
    assert (drum.parent / "figures" / "overview.png").read_bytes() == before


def test_a_scene_without_a_figure_draws_its_one_unplaced_thing(tmp_path: Path) -> None:
    path = tmp_path / "knob.plate"
    path.write_text("platewright 1\n\npart knob\n    add sphere diameter 4 mm\n", encoding="utf-8")
    assert main(["draw", str(path), "--resolution", "50"]) == 0
    assert files_below(tmp_path) == ["figures/knob.png", "knob.plate"]


def test_figures_whose_files_would_fall_together_are_refused(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed(drum, ("figure close", "figure Overview"))
    for command in ("draw", "check"):
        assert main([command, str(drum)]) == 1
        assert "`Overview` and `overview`" in capsys.readouterr().err
    assert files_below(drum.parent) == ["drum.plate"]


# --- usage


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["draw", "{scene}", "--figure", "overveiw"], "did you mean `overview`?"),
        (["draw", "{scene}", "--variant", "lagre"], "did you mean `large`?"),
        (["draw", "{scene}", "--variant", "zzz"], "the scene has small, large"),
        (["draw", "{scene}", "--kind", "bmp"], "invalid choice"),
        (["draw", "{scene}", "--resolution", "nan"], "resolution"),
        (["draw", "{scene}", "--set", "flange"], "NAME=VALUE"),
        (["draw", "{scene}", "--variant", "small", "--all-variants"], "not allowed with"),
        (["draw", "{scene}.gone"], "there is no file"),
        (["check", "{folder}"], "is a folder"),
        (["check", "{scene}", "--project", "{folder}/other"], "project folder"),
        (["format", "{scene}.gone"], "there is no such file"),
        (["export", "{scene}", "--of", "drum", "--to", "drum.xyz"], ".glb"),
        (["export", "{scene}", "--of", "drum", "--to", "drum.stl", "--tolerance", "5"], "length"),
        (["export", "{scene}", "--of", "drum", "--to", "drum.stl", "--tolerance", "5 deg"], "length"),
        (["export", "{scene}", "--of", "drum", "--to", "drum.stl", "--tolerance", "0mm"], "length"),
        (
            ["export", "{scene}", "--of", "can", "--to", "c.stl", "--variant", "small", "--variant", "large"],
            "only once",
        ),
        (["export", "{scene}", "--of", "can", "--of", "lid", "--to", "c.stl"], "only once"),
        (["redraw", "{scene}"], "invalid choice"),
        ([], "COMMAND"),
    ],
)
def test_a_command_line_that_makes_no_sense(
    drum: Path, arguments: list[str], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    given = [argument.format(scene=drum, folder=drum.parent) for argument in arguments]
    assert main(given) == 2
    out, err = capsys.readouterr()
    assert out == "" and said in err
    assert files_below(drum.parent) == ["drum.plate"]


def test_help_and_version_are_results(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--version"]) == 0
    assert capsys.readouterr().out.startswith("platewright ")
    for command in ("draw", "check", "format", "export", "list", "warm-up"):
        assert main([command, "--help"]) == 0
        out, err = capsys.readouterr()
        assert out.startswith(f"usage: platewright {command}") and err == ""


# --- check, list, format, export


def test_check_of_a_clean_scene_says_nothing(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(drum), "--figures"]) == 0
    assert capsys.readouterr() == ("", "")


SEVERAL = """\
platewright 1

given
    high = 10 mm range 5 mm .. 20 mm

part hollow
    add block (10 mm, 10 mm, high)
    cut block (20 mm, 20 mm, 50 mm)

part plug
    add cylinder diameter 4 mm length high
    made of bras

part gone
    add cylinder diameter 4 mm length high
    cut cylinder diameter 40 mm length 90 mm

part post
    add block (2 mm, 2 mm, high)

part far
    add block (2 mm, 2 mm, high / 0)

assembly pair
    place hollow
    place post at (0, 0, high)

assembly fitting
    place plug
    place far at (90 mm, 0, 0)

expect post
    height(post) = 9 mm

expect pair
    height(pair) = 9 mm

expect hollow
    volume(hollow) > 1 mm3

expect plug
    height(plug) = 9 mm

figure overview
    show fitting
    width 20 mm
"""


def test_mistakes_of_different_stages_are_told_in_one_run(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "several.plate"
    path.write_text(SEVERAL, encoding="utf-8")
    assert main(["check", "--json", str(path)]) == 1
    found = json.loads(capsys.readouterr().out)
    problems = [(each["code"], SEVERAL.splitlines()[each["line"] - 1].strip()) for each in found["problems"]]
    assert problems == [
        ("empty-part", "cut block (20 mm, 20 mm, 50 mm)"),
        ("unknown-name", "made of bras"),
        ("empty-part", "cut cylinder diameter 40 mm length 90 mm"),
        ("division-by-zero", "add block (2 mm, 2 mm, high / 0)"),
        ("broken-fact", "height(post) = 9 mm"),
    ]
    assert main(["draw", str(path)]) == 1
    assert files_below(tmp_path) == ["several.plate"]


def test_problems_are_messages_as_text_and_results_for_machines(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed(drum, ("place lid", "place ild"))
    assert main(["check", str(drum)]) == 1
    out, err = capsys.readouterr()
    assert out == "" and "drum.plate:17:11" in err
    assert main(["check", str(drum), "--json"]) == 1
    out, err = capsys.readouterr()
    assert err == "" and json.loads(out)
    assert main(["check", str(drum), "--sarif"]) == 1
    out, err = capsys.readouterr()
    assert err == "" and json.loads(out)["version"] == "2.1.0"


def test_a_problem_of_variants_points_to_them_once(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = changed(drum, ("variants sizes", "expect drum\n    volume(can) <= 60000 mm3\n\nvariants sizes"))
    assert main(["check", str(path)]) == 1
    assert "in variant large" in capsys.readouterr().err


def test_dumps_are_results(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for stage in ("tree", "graph", "triangles"):
        assert main(["check", str(drum), "--dump", stage]) == 0
        out, err = capsys.readouterr()
        assert "lid" in out and err == ""


def test_list_as_text_and_json(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["list", str(drum)]) == 0
    text = capsys.readouterr().out
    for word in ("flange", "depth", "drum.can", "drum.lid", "overview", "close", "small", "large"):
        assert word in text
    assert main(["list", str(drum), "--json"]) == 0
    listed = json.loads(capsys.readouterr().out)
    lid = next(part for part in listed["parts"] if part["path"] == "drum.lid")
    assert lid["copies"] == 1
    # pi/4 * 84^2 * 5 = 27708.847 mm3; the fine rung's chords leave out less than a thousandth
    assert lid["volume_mm3"] == pytest.approx(27708.847, rel=1e-3)
    assert [parameter["name"] for parameter in listed["parameters"]] == ["flange", "depth"]


def test_format_rewrites_once_and_names_what_it_rewrote(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed(drum, ("    place can", "    place   can   # the lower one"))
    loose = drum.read_bytes()
    assert main(["format", str(drum), "--check"]) == 1
    assert capsys.readouterr().out == f"{drum}\n"
    assert drum.read_bytes() == loose
    assert main(["format", str(drum)]) == 0
    assert capsys.readouterr().out == f"{drum}\n"
    assert b"    place can # the lower one\n" in drum.read_bytes().replace(b"  #", b" #")
    assert main(["format", str(drum)]) == 0
    assert main(["format", str(drum), "--check"]) == 0
    assert capsys.readouterr() == ("", "")


def test_format_leaves_a_broken_file_and_does_the_others(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    broken = drum.with_name("broken.plate")
    broken.write_bytes(b"platewright 1\n\npart (\n")
    latin = drum.with_name("latin.plate")
    latin.write_bytes(b"platewright 1\n\n# gr\xf6sse\n")
    changed(drum, ("    place can", "    place   can"))
    assert main(["format", str(broken), str(latin), str(drum)]) == 1
    out, err = capsys.readouterr()
    assert out == f"{drum}\n" and "broken.plate:3" in err and "latin.plate" in err
    assert broken.read_bytes() == b"platewright 1\n\npart (\n"
    assert latin.read_bytes() == b"platewright 1\n\n# gr\xf6sse\n"


@pytest.mark.parametrize(("kind", "beside"), [("csv", []), ("stl", []), ("ply", []), ("glb", []), ("obj", ["lid.mtl"])])
def test_export_writes_the_kind_of_the_suffix(
    drum: Path, kind: str, beside: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    target = drum.with_name(f"lid.{kind}")
    assert main(["export", str(drum), "--of", "drum.lid", "--to", str(target), "--tolerance", "0.1mm"]) == 0
    names = [Path(line).name for line in capsys.readouterr().out.splitlines()]
    assert names == [target.name, *beside]
    assert files_below(drum.parent) == sorted(["drum.plate", *names])


def test_export_of_an_unknown_path_writes_nothing(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["export", str(drum), "--of", "drum.ild", "--to", str(drum.with_name("a.stl"))]) == 1
    err = capsys.readouterr().err
    assert "did you mean `lid`?" in err and " 1 | drum.ild\n   |      ^^^\n" in err
    assert files_below(drum.parent) == ["drum.plate"]


# --- bad input that no file of tests/cases can hold


def test_a_see_may_not_follow_a_link_out_of_the_project(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    outside = tmp_path / "screws.plate"
    outside.write_text("platewright 1\n\npart screw\n    add sphere diameter 4 mm\n", encoding="utf-8")
    project = tmp_path / "project"
    project.mkdir()
    (project / "link.plate").symlink_to(outside)
    path = project / "main.plate"
    path.write_text(
        'platewright 1\n\nsee "link.plate" as screws\n\nassembly one\n    place screws.screw\n', encoding="utf-8"
    )
    assert main(["check", str(path)]) == 1
    err = capsys.readouterr().err
    assert "main.plate:3:" in err and "outside" in err
    assert main(["check", str(path), "--project", str(tmp_path)]) == 0


@pytest.mark.parametrize(
    ("n_open", "n_closed", "wanted"), [(10, 10, 0), (10_000, 10_000, 1), (10_000, 0, 1), (0, 10_000, 1)]
)
def test_nested_parentheses(
    tmp_path: Path, n_open: int, n_closed: int, wanted: int, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "deep.plate"
    value = f"{'(' * n_open}4 mm{')' * n_closed}"
    path.write_text(f"platewright 1\n\npart knob\n    add sphere diameter {value}\n", encoding="utf-8")
    assert main(["check", str(path)]) == wanted
    err = capsys.readouterr().err
    assert err.count("error") == wanted
    assert ("deep.plate:4:" in err) == bool(wanted)


def test_a_scene_over_the_limit_and_an_endless_device(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "large.plate"
    with open(path, "wb") as file:
        file.truncate(FILE_BYTES + 1)
    assert main(["check", str(path)]) == 1
    assert f"{FILE_BYTES:,}" in capsys.readouterr().err
    assert main(["check", "/dev/zero"]) == 1
    assert "not a file" in capsys.readouterr().err


# --- streams


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


@pytest.mark.parametrize(
    ("environment", "terminal", "coloured"),
    [
        ({}, False, False),
        ({}, True, True),
        ({"NO_COLOR": "1"}, True, False),
        ({"NO_COLOR": ""}, True, True),
        ({"FORCE_COLOR": "1"}, False, True),
        ({"FORCE_COLOR": ""}, False, False),
        ({"FORCE_COLOR": "1", "NO_COLOR": "1"}, True, False),
        ({"TERM": "dumb"}, True, False),
    ],
)
def test_when_messages_are_coloured(environment: dict[str, str], terminal: bool, coloured: bool) -> None:
    stream = Terminal() if terminal else io.StringIO()
    assert wants_colour(stream, environment) is coloured


def test_colour_adds_nothing_but_colour(
    drum: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    changed(drum, ("place lid", "place ild"), ("length 5 mm at", "lenght 5 mm at"))
    monkeypatch.delenv("FORCE_COLOR", raising=False)
    monkeypatch.setenv("NO_COLOR", "1")
    main(["check", str(drum)])
    plain = capsys.readouterr().err
    monkeypatch.delenv("NO_COLOR")
    monkeypatch.setenv("FORCE_COLOR", "1")
    main(["check", str(drum)])
    coloured = capsys.readouterr().err
    assert "\x1b[" not in plain and "\x1b[" in coloured
    assert re.sub(r"\x1b\[[0-9;]*m", "", coloured) == plain


def test_a_bar_appears_only_for_who_watches_long_work(monkeypatch: pytest.MonkeyPatch) -> None:
    def said(is_watched: bool, patience: float) -> str:
        monkeypatch.setattr("platewright.compiler.driver.report._PATIENCE", patience)
        err = Terminal()
        report = Report(io.StringIO(), err, False, is_watched)
        with report.progress(2) as steps:
            steps.begin("first")
            steps.share(0.5)
            report.message("aside")
            steps.begin("second")
        return err.getvalue()

    monkeypatch.setenv("TERM", "xterm")
    assert said(is_watched=False, patience=-1) == "platewright: aside\n"
    assert said(is_watched=True, patience=60) == "platewright: aside\n"
    long = said(is_watched=True, patience=-1)
    assert "first" in long and " 25%" in long and "second" in long and "platewright: aside\n" in long


def test_a_reader_that_leaves_is_no_fault(drum: Path) -> None:
    read, write = os.pipe()
    os.close(read)
    command = [sys.executable, "-m", "platewright.compiler", "list", str(drum)]
    with os.fdopen(write, "wb") as stream:
        done = subprocess.run(command, stdout=stream, stderr=subprocess.PIPE, timeout=60, check=False)
    assert done.returncode == 141
    assert done.stderr == b""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="the system has no device that is always full")
@pytest.mark.parametrize("arguments", [["list"], ["check", "--json"], ["draw"], ["--version"]])
def test_results_that_cannot_be_written_are_no_fault(drum: Path, arguments: list[str]) -> None:
    scene_file = [] if arguments == ["--version"] else [str(drum)]
    command = [sys.executable, "-m", "platewright.compiler", *arguments, *scene_file]
    with open("/dev/full", "wb") as full:
        done = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, timeout=60, check=False)
    assert done.returncode == 1
    assert done.stderr == "platewright: cannot write to standard output: No space left on device\n"


def test_a_folder_that_cannot_be_written_is_named_once(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (drum.parent / "figures").write_text("in the way", encoding="utf-8")
    assert main(["draw", str(drum)]) == 1
    err = capsys.readouterr().err
    assert err.count("cannot write") == 1
    assert err.endswith("not written: overview, close\n")


def test_a_parameter_set_twice_points_to_both_values(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["draw", str(drum), "--set", "flange=80 mm", "--set", "flange=90 mm"]) == 1
    err = capsys.readouterr().err
    assert "`flange` is set twice [said-twice]\n 1 | 90 mm\n" in err
    assert err[err.index("set here first") :].startswith("set here first\n 1 | 80 mm\n   | ^^^^^\n")


def test_an_interruption_leaves_no_file_and_no_traceback(drum: Path) -> None:
    script = (
        "import os, signal, sys\n"
        "from platewright.compiler.driver.cli import main\n"
        "fsync = os.fsync\n"
        "os.fsync = lambda descriptor: os.kill(os.getpid(), signal.SIGINT)\n"
        "sys.exit(main(['draw', sys.argv[1], '--resolution', '50']))\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script, str(drum)], capture_output=True, text=True, timeout=120, check=False
    )
    assert done.returncode == 128 + signal.SIGINT
    assert "Traceback" not in done.stderr and done.stdout == ""
    assert files_below(drum.parent) == ["drum.plate"]


# --- faults of our own


def test_a_fault_names_its_stage_and_leaves_what_reproduces_it(
    drum: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def broken(*_: object, **__: object) -> None:
        raise ZeroDivisionError("a fault put in by a test")

    monkeypatch.chdir(drum.parent)
    monkeypatch.setattr(scene, "plan", broken)
    out = drum.parent / "deliver" / "figures"
    out.parent.mkdir()
    assert main(["draw", "drum.plate", "--out", str(out), "--variant", "small", "--resolution", "60"]) == 3
    err = capsys.readouterr().err
    folder = out.parent / "platewright-fault-1"
    assert "drawing small/overview" in err and str(folder) in err and "Traceback" not in err
    assert files_below(folder) == ["command.txt", "sources/drum.plate", "traceback.txt"]
    assert (folder / "sources" / "drum.plate").read_bytes() == drum.read_bytes()
    assert "a fault put in by a test" in (folder / "traceback.txt").read_text(encoding="utf-8")
    assert not out.exists()

    monkeypatch.undo()
    monkeypatch.chdir(folder)
    command = shlex.split((folder / "command.txt").read_text(encoding="utf-8").splitlines()[0])
    assert command[0] == "platewright" and main(command[1:]) == 0
    assert files_below(folder / "figures") == ["small/close.png", "small/overview.png"]


def test_a_fault_without_an_output_folder_goes_to_the_temporary_one(
    drum: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def broken(*_: object, **__: object) -> None:
        raise RuntimeError("a fault put in by a test")

    temporary = tmp_path / "temporary"
    temporary.mkdir()
    monkeypatch.setattr("tempfile.gettempdir", lambda: str(temporary))
    monkeypatch.setattr(scene, "judge", broken)
    assert main(["check", str(drum)]) == 3
    assert str(temporary / "platewright-fault-1") in capsys.readouterr().err
    assert main(["check", str(drum)]) == 3
    assert sorted(path.name for path in temporary.iterdir()) == ["platewright-fault-1", "platewright-fault-2"]


# --- what is imported


@pytest.mark.parametrize("command", ["check", "list", "format"])
def test_what_draws_nothing_imports_no_compiler_of_kernels_and_no_pictures(drum: Path, command: str) -> None:
    script = NO_NUMBA + "print(code, sorted({'numba', 'llvmlite', 'PIL', 'rich'} & set(sys.modules)))"
    done = subprocess.run(
        [sys.executable, "-c", script, command, str(drum)], capture_output=True, text=True, timeout=60, check=True
    )
    assert done.stdout.splitlines()[-1] == "0 []", done.stderr


def test_format_imports_no_numbers_and_no_solids(drum: Path) -> None:
    script = NO_NUMBA + "print(code, sorted({'numpy', 'manifold3d'} & set(sys.modules)))"
    done = subprocess.run(
        [sys.executable, "-c", script, "format", str(drum)], capture_output=True, text=True, timeout=60, check=True
    )
    assert done.stdout.splitlines()[-1] == "0 []", done.stderr


def test_the_module_is_the_command(drum: Path) -> None:
    done = process("check", str(changed(drum, ("place lid", "place ild"))))
    assert done.returncode == 1 and done.stdout == "" and "drum.plate:17" in done.stderr
