"""Why a line does not fit the vocabulary, in the author's words."""

from __future__ import annotations

from collections.abc import Iterable

from .layout import RawLine, slip_problem
from .matcher import Account, Matcher
from .nearest import nearest
from .patterns import Element, Equals, Literal, Pattern, Slot, Starts, Vocabulary
from .problems import Problem, Severity
from .scanner import Piece, Slip
from .source import Span
from .tree import Binary, Call, Expression, Path
from .values import Item, sign_slip, unit_slip
from .words import KINDS, PLACES, SHAPE_WORDS


def explain(raw: RawLine, starts: Starts, context: str, words: Vocabulary) -> Problem:
    """The problem of a line that no row which may start there can read to its end."""
    account = Account()
    matcher = Matcher(raw, words, account)
    found = matcher.start(starts, 0)
    if found is not None:
        matcher.clauses(found[2], found[1], [])
    return _Explanation(raw, account, words, context).problem()


def explain_clauses(raw: RawLine, pattern: Pattern, words: Vocabulary) -> Problem:
    """The problem of an indented line that is not made of clauses of the line above."""
    account = Account()
    Matcher(raw, words, account).clauses(pattern, 0, [])
    return _Explanation(raw, account, words, "").problem()


class _Explanation:
    """What is known about one mismatch: the furthest item that did not fit, and what could have stood there."""

    def __init__(self, raw: RawLine, account: Account, words: Vocabulary, context: str) -> None:
        self.raw = raw
        self.words = words
        self.context = context
        self.at = max(account.at, 0)
        self.account = account
        self.item = raw.items[self.at] if self.at < len(raw.items) else None
        self.before = raw.items[self.at - 1] if self.at else None
        self.known = self.expected_words()

    def expected_words(self) -> list[str]:
        """The words that could have stood there, in the order of the vocabulary."""
        known: list[str] = []
        for element in self.account.elements:
            if isinstance(element, Literal):
                known.append(element.text)
            elif isinstance(element, Slot):
                known.extend(option[0] for option in element.options)
                if element.kind == "shape":
                    known.extend(SHAPE_WORDS)
        for starts in self.account.starts:
            known.extend(starts.by_word)
        return list(dict.fromkeys(known))

    def problem(self) -> Problem:
        slip = self.slip()
        if slip is not None:
            return slip_problem(self.raw.place, slip)
        if self.item is None:
            return self.missing()
        if self.item.word:
            return self.wrong_word(self.item)
        return self.wrong_value(self.item)

    def make(self, code: str, span: Span, sentence: str, hint: str = "") -> Problem:
        return Problem(code, Severity.ERROR, span, sentence, hint)

    # --- mistakes of touching, which the items show

    def slip(self) -> Slip | None:
        item = self.item
        if item is None:
            return None
        text = self.raw.text
        if isinstance(item.node, Call) and item.node.path.dotted in self.known:
            word = item.node.path.dotted
            return Slip(
                "call-space",
                item.start,
                item.start + len(word) + 1,
                f"the parenthesis behind the word `{word}` does not touch it",
                f"write `{word} (`",
            )
        leftmost = _leftmost(item.node)
        if isinstance(item.node, Binary) and isinstance(leftmost, Path) and leftmost.dotted in self.known:
            start = leftmost.span.end_column
            if item.node.operator == "-":
                return Slip("sign-space", start, start + 1, "a sign touches its value", "write `-` close to the value")
        if self.before is None:
            return None
        is_sign = text[item.start : item.start + 1] == "-"
        if is_sign and (self.account.is_leftover or not self.before.word):
            return sign_slip(item.start)
        if item.kind == "OPEN" and item.start == self.before.end + 1 and self.account.is_leftover and self.before.word:
            if self.before.word not in self.known:
                return Slip(
                    "call-space",
                    self.before.end,
                    item.start + 1,
                    "the parenthesis of a call touches its name",
                    f"write `{self.before.word}(`",
                )
        if item.word and self.before.kind == "NUMBER" and not nearest(item.word, self.known):
            if item.word not in self.words.homes:
                return unit_slip(text, Piece("NUMBER", self.before.start, self.before.end), item.start, item.end)
        return None

    # --- words and values

    def missing(self) -> Problem:
        """The line ends where more is needed."""
        wanted = _listed(self.wanted())
        span = self.raw.place.span(self.raw.end, self.raw.end)
        return self.make("missing-value", span, f"expected {wanted} behind {self.shown_before()}", self.example())

    def shown_before(self) -> str:
        if self.before is None:
            return "this"
        return f"`{self.raw.text[self.before.start : self.before.end]}`"

    def wanted(self) -> list[str]:
        """What could have stood there, for people."""
        wanted = [_describe(element) for element in self.account.elements]
        if not wanted and self.account.starts:
            wanted = ["a word of the language"]
        return list(dict.fromkeys(wanted))

    def example(self) -> str:
        pattern = self.account.pattern
        return f"for example `{pattern.row.example}`" if pattern is not None and pattern.row.example else ""

    def wrong_word(self, item: Item) -> Problem:
        span = self.raw.place.span(item.start, item.end)
        near = nearest(item.word, self.known)
        if near and near != item.word:
            return self.make(
                "unknown-word", span, f"`{item.word}` is not a word that stands here", f"did you mean `{near}`?"
            )
        shape = self.misspelt_shape()
        if shape is not None:
            return shape
        homes = self.words.homes.get(item.word)
        if self.account.elements and not self.account.is_leftover:
            where = self.raw.place.span(self.before.end, self.before.end) if self.before else span
            sentence = f"expected {_listed(self.wanted())} behind {self.shown_before()}, found `{item.word}`"
            return self.make("missing-value", where, sentence, self.example())
        if homes:
            places = _listed([PLACES[home] for home in homes if home in PLACES], "and")
            return self.make(
                "misplaced-word", span, f"`{item.word}` may not stand here", f"it stands {places}" if places else ""
            )
        hint = f"here may stand: {', '.join(self.known[:12])}" if self.known else self.example()
        sentence = f"`{item.word}` is not a word that stands here"
        return self.make("unknown-word", span, sentence, hint)

    def misspelt_shape(self) -> Problem | None:
        """A part that nobody declared may be a shape with a slip in it: what follows does not fit a part."""
        before = self.before
        if before is None or not before.word or not self.account.is_leftover or self.at < 2:
            return None
        near = nearest(before.word, SHAPE_WORDS)
        if not near or self.raw.items[self.at - 2].word not in ("add", "cut", "keep"):
            return None
        span = self.raw.place.span(before.start, before.end)
        return self.make("unknown-word", span, f"`{before.word}` is not a shape", f"did you mean `{near}`?")

    def wrong_value(self, item: Item) -> Problem:
        assert item.node is not None
        span = self.raw.place.span(item.start, item.end)
        if item.node.span.line != self.raw.place.line:
            span = item.node.span
        shown = f"`{self.raw.text[item.start : item.end]}`" if item.end > item.start else "this text"
        if self.account.elements and not self.account.is_leftover:
            wanted = _listed(self.wanted())
            if all(isinstance(element, Literal) for element in self.account.elements):
                where = self.raw.place.span(self.before.end, self.before.end) if self.before else span
                return self.make(
                    "missing-value",
                    where,
                    f"expected {wanted} behind {self.shown_before()}, found {shown}",
                    self.example(),
                )
            return self.make("wrong-form", span, f"expected {wanted}, found {shown}", self.example())
        if self.before is None:
            return self.make("wrong-form", span, f"expected a word that starts a line, found {shown}")
        return self.make("value-too-many", span, f"nothing takes {shown} here", self.example())


def _leftmost(node: object) -> Expression | None:
    while isinstance(node, Binary):
        node = node.left
    return node if isinstance(node, Path) else None


def _describe(element: Element) -> str:
    if isinstance(element, Literal):
        return f"`{element.text}`"
    if isinstance(element, Slot):
        if element.options:
            return _listed([f"`{' '.join(option)}`" for option in element.options])
        return KINDS[element.kind]
    assert isinstance(element, Equals)
    return "`name = value`" if element.left.kind in ("new", "signature") else "a measure"


def _listed(names: Iterable[str], word: str = "or") -> str:
    known = list(names)
    if len(known) < 2:
        return "".join(known)
    return f"{', '.join(known[:-1])} {word} {known[-1]}"
