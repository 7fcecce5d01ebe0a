"""Reading that stays in the project folder, writing that is whole or nothing."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from platewright.compiler.driver import files, names
from platewright.compiler.limits import FILE_BYTES


def _tree(folder: Path) -> dict[str, bytes]:
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def test_a_file_inside_is_read(tmp_path: Path) -> None:
    (tmp_path / "parts").mkdir()
    (tmp_path / "parts" / "screw.plate").write_bytes(b"platewright 1\r\n")
    assert files.read_confined(tmp_path, "parts/screw.plate") == b"platewright 1\r\n"
    assert files.read_confined(tmp_path, "parts/../parts/screw.plate") == b"platewright 1\r\n"


@pytest.mark.parametrize("name", ["../secret", "parts/../../secret", "../missing", "/etc/hostname", "/no/such/file"])
def test_a_path_that_leaves_is_outside_whether_or_not_it_exists(tmp_path: Path, name: str) -> None:
    (tmp_path / "secret").write_bytes(b"secret")
    project = tmp_path / "project"
    (project / "parts").mkdir(parents=True)
    assert files.read_confined(project, name) == "outside"


def test_a_symbolic_link_may_not_lead_outside(tmp_path: Path) -> None:
    (tmp_path / "secret").write_bytes(b"secret")
    project = tmp_path / "project"
    project.mkdir()
    (project / "link").symlink_to(tmp_path / "secret")
    (project / "folder").symlink_to(tmp_path)
    (project / "loop").symlink_to(project / "loop")
    (project / "real").write_bytes(b"fine")
    (project / "inner").symlink_to(project / "real")
    assert files.read_confined(project, "link") == "outside"
    assert files.read_confined(project, "folder/secret") == "outside"
    assert files.read_confined(project, "loop") == "unreadable"
    assert files.read_confined(project, "inner") == b"fine"


def test_a_project_folder_reached_by_a_link_is_that_folder(tmp_path: Path) -> None:
    (tmp_path / "project").mkdir()
    (tmp_path / "project" / "a").write_bytes(b"a")
    (tmp_path / "door").symlink_to(tmp_path / "project")
    assert files.read_confined(tmp_path / "door", "a") == b"a"


def test_what_is_no_regular_file_is_refused_without_waiting(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    (tmp_path / "folder").mkdir()
    assert files.read_confined(tmp_path, "pipe") == "not a file"
    assert files.read_confined(tmp_path, "folder") == "not a file"
    assert files.read_confined(tmp_path, "gone") == "missing"
    assert files.read_confined(tmp_path, "gone/deeper") == "missing"


@pytest.mark.parametrize("name", ["nul\0byte", "x" * 5000])
def test_names_that_no_file_system_takes_are_unreadable(tmp_path: Path, name: str) -> None:
    assert files.read_confined(tmp_path, name) == "unreadable"


def test_the_limit_is_exact(tmp_path: Path) -> None:
    with open(tmp_path / "large", "wb") as file:
        file.truncate(FILE_BYTES)
    assert files.read_confined(tmp_path, "large") == bytes(FILE_BYTES)
    with open(tmp_path / "large", "ab") as file:
        file.write(b"x")
    assert files.read_confined(tmp_path, "large") == "too large"


def test_a_set_is_written_with_its_folders(tmp_path: Path) -> None:
    files.write_all({tmp_path / "a" / "b" / "one": b"1", tmp_path / "a" / "two": b"2"})
    assert _tree(tmp_path) == {"a/b/one": b"1", "a/two": b"2"}


def test_a_failing_write_leaves_everything_as_it_was(tmp_path: Path) -> None:
    (tmp_path / "one").write_bytes(b"old")
    (tmp_path / "three").mkdir()
    wanted = {tmp_path / "one": b"new", tmp_path / "fresh" / "two": b"new", tmp_path / "three": b"new"}
    with pytest.raises(IsADirectoryError):
        files.write_all(wanted)
    assert _tree(tmp_path) == {"one": b"old"}
    assert sorted(path.name for path in tmp_path.iterdir()) == ["one", "three"]


def test_a_rename_that_fails_undoes_those_before_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "one").write_bytes(b"old")
    replace = os.replace

    def failing(source: Path, target: Path) -> None:
        if Path(target).name == "two" and Path(source).suffix == ".new":
            raise OSError(28, "No space left on device", str(target))
        replace(source, target)

    monkeypatch.setattr(os, "replace", failing)
    with pytest.raises(OSError, match="No space left"):
        files.write_all({tmp_path / "one": b"new", tmp_path / "two": b"new"})
    assert _tree(tmp_path) == {"one": b"old"}


def test_an_interruption_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(_: int) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", interrupted)
    with pytest.raises(KeyboardInterrupt):
        files.write_all({tmp_path / "figures" / "one": b"new"})
    assert list(tmp_path.iterdir()) == []


def test_permissions_of_an_earlier_file_stay(tmp_path: Path) -> None:
    scene = tmp_path / "a.plate"
    scene.write_bytes(b"old")
    scene.chmod(0o640)
    files.write_all({scene: b"new"})
    assert scene.read_bytes() == b"new"
    assert scene.stat().st_mode & 0o777 == 0o640


@pytest.mark.parametrize("name", ["", ".", "..", "a/b", "a\\b", "a:b", "tab\there", ".hidden", "end.", "NUL", "com1.x"])
def test_names_unfit_for_files(name: str) -> None:
    assert names.unfit(name)


@pytest.mark.parametrize("name", ["overview", "rg160", "M4", "größe", "M4 x 12", "console"])
def test_names_fit_for_files(name: str) -> None:
    assert names.unfit(name) == ""


def test_names_that_differ_only_in_capitals_or_composition_clash() -> None:
    assert names.clash(["a", "b", "A"]) == ("a", "A")
    assert names.clash(["Stra\u00dfe", "STRASSE"]) == ("Stra\u00dfe", "STRASSE")
    assert names.clash(["caf\u00e9", "cafe\u0301"]) == ("caf\u00e9", "cafe\u0301")
    assert names.clash(["a", "b", "a"]) is None
