"""How a phase reports an author's mistakes: problems are collected in order, and evaluation goes on where it can."""

from __future__ import annotations

from types import TracebackType

from platewright.lang.problems import Problem, Related, Severity
from platewright.lang.source import Span


class Mistake(Exception):
    """An author's mistake on its way to the list of problems; without a problem if it has been reported already."""

    def __init__(self, problem: Problem | None) -> None:
        super().__init__(problem.sentence if problem else "reported")
        self.problem = problem


def mistake(
    code: str, span: Span, sentence: str, hint: str = "", related: tuple[Related, ...] = (), within: str = ""
) -> Mistake:
    """A mistake ready to raise."""
    return Mistake(Problem(code, Severity.ERROR, span, sentence, hint, related, within))


def confined(problem: Problem, figure: str) -> Problem:
    """The same problem, confined to a figure."""
    return Problem(
        problem.code, problem.severity, problem.span, problem.sentence, problem.hint, problem.related, figure
    )


class Problems:
    """Problems in the order found, each once."""

    def __init__(self) -> None:
        self._found: dict[tuple[str, Span, str, str], Problem] = {}
        self._n_mistakes = 0

    def add(self, problem: Problem) -> None:
        """Take in one problem."""
        self._n_mistakes += problem.severity is Severity.ERROR
        self._found.setdefault((problem.code, problem.span, problem.sentence, problem.within), problem)

    def note_known(self) -> None:
        """Count a mistake whose problem has been taken in before."""
        self._n_mistakes += 1

    def extend(self, problems: tuple[Problem, ...]) -> None:
        """Take in several."""
        for problem in problems:
            self.add(problem)

    def error(self, code: str, span: Span, sentence: str, hint: str = "", related: tuple[Related, ...] = ()) -> None:
        """Report an error."""
        self.add(Problem(code, Severity.ERROR, span, sentence, hint, related))

    def warn(self, code: str, span: Span, sentence: str, hint: str = "", related: tuple[Related, ...] = ()) -> None:
        """Report a warning."""
        self.add(Problem(code, Severity.WARNING, span, sentence, hint, related))

    def note(self, code: str, span: Span, sentence: str, hint: str = "") -> None:
        """Tell something that is neither wrong nor a likely slip."""
        self.add(Problem(code, Severity.NOTE, span, sentence, hint))

    def collecting(self) -> _Collecting:
        """Turn a mistake raised inside a `with` block into a collected problem, and go on after the block."""
        return _Collecting(self)

    def all(self) -> tuple[Problem, ...]:
        """Everything found, in order."""
        return tuple(self._found.values())

    @property
    def n_mistakes(self) -> int:
        """How many errors were found, and how many mistakes whose error had been found before."""
        return self._n_mistakes

    @property
    def has_errors(self) -> bool:
        """Whether anything found stops output."""
        return any(problem.severity is Severity.ERROR for problem in self._found.values())


class _Collecting:
    def __init__(self, problems: Problems) -> None:
        self._problems = problems

    def __enter__(self) -> None:
        return None

    def __exit__(
        self, kind: type[BaseException] | None, found: BaseException | None, trace: TracebackType | None
    ) -> bool:
        if not isinstance(found, Mistake):
            return False
        if found.problem is not None:
            self._problems.add(found.problem)
        else:
            self._problems.note_known()
        return True
