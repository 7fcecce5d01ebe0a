"""One line's items against patterns."""

from __future__ import annotations

from msgspec import Struct, field

from .forms import signature_of, value_of
from .items import Equation, Item, Place, Series
from .layout import RawLine
from .patterns import Either, Element, Equals, Literal, Optional, Pattern, Slot, Starts, Vocabulary
from .source import Span
from .tree import Path, Reading, Value, Word

NO_STARTS = Starts({}, ())


class Account(Struct):
    """What could have stood at the furthest item that did not fit.

    `elements` are what patterns wanted there and `rows` those patterns, each at the same index, `starts` the rows that
    could have begun there, `pattern` the row that was being read, and `is_leftover` says that this row was already
    complete.
    """

    at: int = -1
    elements: list[Element] = field(default_factory=list)
    rows: list[Pattern | None] = field(default_factory=list)
    starts: list[Starts] = field(default_factory=list)
    pattern: Pattern | None = None
    is_leftover: bool = False

    def move(self, at: int, pattern: Pattern | None) -> bool:
        """Whether something wanted at `at` still counts, and forgets what was wanted before it."""
        if at > self.at:
            self.at = at
            self.elements = []
            self.rows = []
            self.starts = []
            self.is_leftover = False
            self.pattern = pattern
        return at == self.at


class Matcher:
    """Reads the items of one line. With an `account`, keeps what could have stood where it fails."""

    __slots__ = ("account", "items", "n_items", "pattern", "place", "raw", "words")

    def __init__(self, raw: RawLine, words: Vocabulary, account: Account | None = None) -> None:
        self.raw = raw
        self.place = raw.place
        self.items = raw.items
        self.n_items = len(raw.items)
        self.words = words
        self.account = account
        self.pattern: Pattern | None = None

    def start(self, starts: Starts, at: int) -> tuple[Reading, int, Pattern] | None:
        """A reading by one of the rows that may start at item `at`, the item behind it, and the row; or None."""
        rows = starts.by_word.get(self.items[at].word) if at < self.n_items else None
        if rows is None:
            rows = starts.wordless
            if self.account is not None and self.account.move(at, self.pattern):
                self.account.starts.append(starts)
        before = self.pattern
        for pattern in rows:
            self.pattern = pattern
            values: list[tuple[str, Value]] = []
            after = self.match(pattern.elements, at, values)
            self.pattern = before
            if after > 0:
                first = self.items[at]
                span = self.span(at, after)
                if pattern.words:
                    end = self.items[at + pattern.word.count(" ")].end
                    word_span = self.place.span(first.start, end)
                else:
                    word_span = self.place.span(first.start, first.end)
                return Reading(pattern.row.key, pattern.word, tuple(values), span, word_span), after, pattern
        return None

    def clauses(self, pattern: Pattern, at: int, read: list[Reading]) -> int:
        """Reads clauses of a row from item `at` to the end of the line; the number of items read, or -1."""
        starts = self.words.clauses[pattern.row.clauses] if pattern.row.clauses else NO_STARTS
        while at < self.n_items:
            if self.account is not None and self.account.move(at, pattern):
                self.account.starts.append(starts)
                self.account.is_leftover = True
            self.pattern = pattern
            found = self.start(starts, at)
            if found is None:
                return -1
            reading, at, _ = found
            read.append(reading)
        return at

    def span(self, first: int, after: int) -> Span:
        """The span of the items from `first` to before `after`."""
        last = self.items[after - 1]
        if last.node is not None and last.node.span.end_line != self.place.line:
            return self.place.span(self.items[first].start, last.end).to(last.node.span)
        return self.place.span(self.items[first].start, last.end)

    def match(self, elements: tuple[Element, ...], at: int, values: list[tuple[str, Value]]) -> int:
        """Reads items by a run of elements from item `at`; the item behind them, or -1."""
        for element in elements:
            kind = type(element)
            if kind is Literal:
                if at < self.n_items and self.items[at].word == element.text:  # type: ignore[union-attr]
                    at += 1
                else:
                    return self.miss(at, element)
            elif kind is Slot:
                at = self.slot(element, at, values)  # type: ignore[arg-type]
                if at < 0:
                    return -1
            else:
                at = self.compound(element, at, values)
                if at < 0:
                    return -1
        return at

    def compound(self, element: Element, at: int, values: list[tuple[str, Value]]) -> int:
        """What may be left out, alternatives, equations."""
        if isinstance(element, Optional):
            first = element.elements[0]
            if at >= self.n_items or not self.may_start(first, self.items[at]):
                self.miss(at, first)
                return at
            return self.match(element.elements, at, values)
        if isinstance(element, Either):
            for branch in element.branches:
                read: list[tuple[str, Value]] = []
                after = self.match(branch, at, read)
                if after >= 0:
                    values.extend(read)
                    return after
            return -1
        assert isinstance(element, Equals)
        return self.equals(element, at, values)

    def may_start(self, element: Element, item: Item) -> bool:
        """Whether what may be left out starts at an item: by its word, or by a value that starts no clause."""
        if isinstance(element, Literal):
            return item.word == element.text
        if isinstance(element, Slot) and element.options and item.node is None:
            return any(option[0] == item.word for option in element.options)
        if item.node is not None or self.pattern is None or not self.pattern.row.clauses:
            return True
        return item.word not in self.words.clauses[self.pattern.row.clauses].by_word

    def slot(self, slot: Slot, at: int, values: list[tuple[str, Value]]) -> int:
        """One value by the kind of its slot."""
        if at >= self.n_items:
            return self.miss(at, slot)
        item = self.items[at]
        match slot.kind:
            case "words":
                return self.option(slot, at, values)
            case "shape":
                found = self.start(self.words.places["shape"], at)
                if found is None:
                    return -1
                values.append((slot.name, found[0]))
                return found[1]
            case "signature":
                signature = signature_of(self.place, item)
                if signature is None:
                    return self.miss(at, slot)
                values.append((slot.name, signature[0]))
                if signature[1] is not None:
                    values.append(("parameters", signature[1]))
                return at + 1
        value = value_of(self.place, slot.kind, item)
        if value is None:
            return self.miss(at, slot)
        values.append((slot.name, value))
        return at + 1

    def option(self, slot: Slot, at: int, values: list[tuple[str, Value]]) -> int:
        """One of the words a slot offers; an option may be several words, one of them `and`."""
        for option in slot.options:
            said: list[str] = []
            after = at
            while len(said) < len(option) and after < self.n_items:
                item = self.items[after]
                said.extend(self.raw.text[item.start : item.end].split() if item.node is not None else (item.word,))
                after += 1
            if tuple(said) == option:
                values.append((slot.name, Word(" ".join(option), self.span(at, after))))
                return after
        return self.miss(at, slot)

    def equals(self, element: Equals, at: int, values: list[tuple[str, Value]]) -> int:
        """An equation, or its left side alone where that will do."""
        if at >= self.n_items:
            return self.miss(at, element)
        item = self.items[at]
        if not isinstance(item.node, Equation):
            if element.is_optional and not isinstance(item.node, Series):
                return self.slot(element.left, at, values)
            return self.miss(at, element)
        left, right = _sides(self.place, item.node)
        for slot, side in ((element.left, left), (element.right, right)):
            if slot.kind == "signature":
                signature = signature_of(self.place, side)
                if signature is None:
                    return self.miss(at, element)
                values.append((slot.name, signature[0]))
                if signature[1] is not None:
                    values.append(("parameters", signature[1]))
                continue
            value = value_of(self.place, slot.kind, side)
            if value is None:
                return self.miss(at, element)
            values.append((slot.name, value))
        return at + 1

    def miss(self, at: int, element: Element) -> int:
        """Notes what was wanted at an item that did not fit; always -1."""
        if self.account is not None and self.account.move(at, self.pattern):
            self.account.elements.append(element)
            self.account.rows.append(self.pattern)
            self.account.pattern = self.account.pattern or self.pattern
        return -1


def _sides(place: Place, equation: Equation) -> tuple[Item, Item]:
    """The two sides of an equation as items of their own, a plain name as a bare word."""
    sides = []
    for node in (equation.left, equation.right):
        start, end = node.span.column - 1, node.span.end_column - 1
        if isinstance(node, Path) and len(node.steps) == 1 and node.steps[0].index is None:
            sides.append(Item(node.steps[0].name, None, start, end, "NAME"))
        else:
            sides.append(Item("", node, start, end, ""))
    return sides[0], sides[1]
