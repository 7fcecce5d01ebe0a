"""What a run says: results on standard output, messages on standard error, colour and progress where a person reads."""

from __future__ import annotations

import io
import time
from collections.abc import Iterator, Mapping, Sequence
from contextlib import AbstractContextManager, contextmanager, nullcontext
from typing import TYPE_CHECKING, TextIO

from platewright.lang.problems import Problem

if TYPE_CHECKING:
    from rich.progress import Progress, TaskID

_PATIENCE = 0.7
"""Seconds of work after which a progress bar appears."""


def wants_colour(stream: TextIO, environment: Mapping[str, str]) -> bool:
    """Whether text on this stream is coloured: NO_COLOR forbids, FORCE_COLOR demands, else it takes a capable terminal.

    A variable that is set but empty counts as not set, as no-color.org words it.
    """
    if environment.get("NO_COLOR"):
        return False
    if environment.get("FORCE_COLOR"):
        return True
    return environment.get("TERM") != "dumb" and stream.isatty()


class StreamError(Exception):
    """Standard output takes no results; the sentence says why."""


def write_results(stream: TextIO, text: str) -> None:
    """Write to standard output at once. Raises StreamError, or BrokenPipeError if its reader has gone."""
    try:
        stream.write(text)
        stream.flush()
    except BrokenPipeError:
        raise
    except OSError as fault:
        raise StreamError(f"cannot write to standard output: {fault.strerror or fault}") from fault


class Report:
    """The two streams of a run. Nothing else in the driver prints.

    `is_coloured` says whether messages carry colour, `is_watched` whether a person watches the second stream.
    """

    def __init__(self, out: TextIO, err: TextIO, is_coloured: bool, is_watched: bool) -> None:
        self._out, self._err = out, err
        self._is_coloured, self._is_watched = is_coloured, is_watched
        self._bar: _Bar | None = None
        self._said: set[str] = set()
        self._has_problems = False

    def result(self, line: str) -> None:
        """One line of result."""
        self.document(f"{line}\n")

    def document(self, text: str) -> None:
        """A whole text as result, ending with a line feed: a dump, a list, problems for a machine.

        Raises StreamError if it cannot be written, BrokenPipeError if its reader has gone.
        """
        with self._aside():
            write_results(self._out, text)

    def message(self, line: str) -> None:
        """One line to the person at the terminal."""
        self._write(self._err, f"platewright: {line}\n")

    def message_once(self, line: str) -> None:
        """A line that is said only the first time in a run."""
        if line not in self._said:
            self._said.add(line)
            self.message(line)

    def problems(self, problems: Sequence[Problem], texts: Mapping[str, str]) -> None:
        """Problems as text with the lines they are in, an empty line between any two."""
        if problems:
            from platewright.lang.render import render_text

            text = ("\n" if self._has_problems else "") + render_text(problems, texts)
            self._has_problems = True
            self._write(self._err, _coloured(text) if self._is_coloured else text)

    def _write(self, stream: TextIO, text: str) -> None:
        with self._aside():
            stream.write(text)
            stream.flush()

    def _aside(self) -> AbstractContextManager[None]:
        return self._bar.aside() if self._bar is not None else nullcontext()

    @contextmanager
    def progress(self, n_steps: int) -> Iterator[Steps]:
        """Long work in steps. On a terminal a bar appears once the work proves long; elsewhere nothing does."""
        if not self._is_watched:
            yield Steps()
            return
        self._bar = _Bar(self._err, n_steps, self._is_coloured)
        try:
            yield self._bar
        finally:
            self._bar.end()
            self._bar = None


class Steps:
    """Told what is being worked on and how far it is. This one tells nobody."""

    def begin(self, label: str) -> None:
        """Count the step before as done and name the next."""

    def share(self, done: float) -> None:
        """How much of the step at hand is done, 0..1."""


class _Bar(Steps):
    """A bar that is drawn only after `_PATIENCE` seconds, so that short work imports no terminal library."""

    def __init__(self, stream: TextIO, n_steps: int, is_coloured: bool) -> None:
        self._stream, self._n_steps, self._is_coloured = stream, n_steps, is_coloured
        self._started = time.monotonic()
        self._n_done = -1
        self._label = ""
        self._shown: tuple[Progress, TaskID] | None = None

    def begin(self, label: str) -> None:
        self._n_done += 1
        self._label = label
        self.share(0.0)

    def share(self, done: float) -> None:
        if self._shown is None and time.monotonic() - self._started > _PATIENCE:
            self._show()
        if self._shown is not None:
            progress, task = self._shown
            progress.update(task, completed=self._n_done + done, description=self._label)

    @contextmanager
    def aside(self) -> Iterator[None]:
        """Take the bar off the terminal while something else is written."""
        if self._shown is None:
            yield
            return
        progress, _ = self._shown
        progress.stop()
        yield
        progress.start()

    def end(self) -> None:
        """Take the bar away."""
        if self._shown is not None:
            self._shown[0].stop()

    def _show(self) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn, TimeRemainingColumn

        console = Console(file=self._stream, no_color=not self._is_coloured)
        columns = (
            TextColumn("{task.description}", markup=False),
            BarColumn(),
            TaskProgressColumn(),
            TimeRemainingColumn(),
        )
        progress = Progress(*columns, console=console, transient=True)
        self._shown = progress, progress.add_task("", total=self._n_steps)
        progress.start()


_STYLES = {"error": "bold red", "warning": "bold yellow", "note": "bold blue", "hint": "green"}


def _coloured(text: str) -> str:
    """The same characters, with severities, hints and carets in colour."""
    from rich.console import Console
    from rich.text import Text

    coloured = Text(text, end="")
    for word, style in _STYLES.items():
        coloured.highlight_regex(rf"\b{word}\b(?=[:\[])", style)
    coloured.highlight_regex(r"(?m)^[ |]*\^+$", "bold red")
    buffer = io.StringIO()
    console = Console(file=buffer, force_terminal=True, color_system="standard", legacy_windows=False)
    console.print(coloured, soft_wrap=True, end="")
    return buffer.getvalue()
