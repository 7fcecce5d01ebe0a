"""Why a line does not fit the vocabulary, in the author's words."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from .items import Equation, Item, Series, plain_name
from .layout import RawLine, slip_problem
from .matcher import Account, Matcher
from .meant import shape_hint, shape_meant
from .nearest import nearest
from .patterns import Either, Element, Equals, Literal, Optional, Pattern, Slot, Starts, Vocabulary
from .problems import Problem, Severity
from .scanner import Slip
from .source import Span
from .tree import Binary, Call, Path
from .values import sign_slip, unit_slip
from .words import KINDS, PLACES, SHAPE_WORDS


def explain(raw: RawLine, starts: Starts, words: Vocabulary, things: frozenset[str]) -> Problem:
    """The problem of a line that no row which may start there can read to its end.

    `things` are the names of the parts and assemblies of the file.
    """
    account = Account()
    matcher = Matcher(raw, words, account)
    found = matcher.start(starts, 0)
    if found is not None:
        matcher.clauses(found[2], found[1], [])
    return _Explanation(raw, account, words, things).problem()


def explain_clauses(raw: RawLine, pattern: Pattern, words: Vocabulary, things: frozenset[str]) -> Problem:
    """The problem of an indented line that is not made of clauses of the line above; `things` as for `explain`."""
    account = Account()
    Matcher(raw, words, account).clauses(pattern, 0, [])
    return _Explanation(raw, account, words, things).problem()


class _Explanation:
    """What is known about one mismatch: the furthest item that did not fit, and what could have stood there."""

    def __init__(self, raw: RawLine, account: Account, words: Vocabulary, things: frozenset[str]) -> None:
        self.raw = raw
        self.words = words
        self.things = things
        self.account = account
        self.at = max(account.at, 0)
        self.item = raw.items[self.at] if self.at < len(raw.items) else None
        self.before = raw.items[self.at - 1] if self.at else None
        self.known = self.expected_words()
        self.rows, self.elements = self.drawn_today()

    def expected_words(self) -> list[str]:
        """The words that could have stood there, in the order of the vocabulary."""
        known: list[str] = []
        for element in self.account.elements:
            if isinstance(element, Literal):
                known.append(element.text)
            elif isinstance(element, Slot):
                known.extend(option[0] for option in element.options)
        for starts in self.account.starts:
            known.extend(starts.by_word)
        if any(isinstance(element, Slot) and element.kind == "shape" for element in self.account.elements):
            known.extend(sorted(SHAPE_WORDS))
        return list(dict.fromkeys(known))

    def drawn_today(self) -> tuple[list[Pattern], list[Element]]:
        """The rows that were being read and what they wanted: of the words drawn today where there are any."""
        wanted = [(row, element) for row, element in zip(self.account.rows, self.account.elements, strict=True) if row]
        today = [(row, element) for row, element in wanted if not row.row.later] or wanted
        rows = {row.row.key: row for row, _ in today}
        return list(rows.values()), [element for _, element in today]

    def problem(self) -> Problem:
        """The one problem that says it best."""
        slip = self.unknown_shape() or self.touching() or self.swallowed_word()
        if slip is not None:
            return slip_problem(self.raw.place, slip)
        if self.item is None:
            return self.missing()
        return self.wrong_word(self.item) if self.item.word else self.wrong_value(self.item)

    # --- mistakes that the neighbours show

    def touching(self) -> Slip | None:
        """A parenthesis, a sign or a unit that touches what it should not, or does not touch what it should."""
        item, before, text = self.item, self.before, self.raw.text
        if item is None:
            return None
        if isinstance(item.node, Call) and item.node.path.dotted in self.known:
            word = item.node.path.dotted
            sentence = f"the parenthesis behind the word `{word}` does not touch it"
            return Slip("call-space", item.start, item.start + len(word) + 1, sentence, f"write `{word} (`")
        behind = self.raw.items[self.at + 1] if self.at + 1 < len(self.raw.items) else None
        if self.wants_setting() and item.word and behind is not None and behind.kind == "OPEN":
            sentence = "the parenthesis of a function's parameters touches its name"
            return Slip("call-space", item.end, behind.start + 1, sentence, f"write `{item.word}(`")
        leftmost = _leftmost(item.node)
        if isinstance(item.node, Binary) and leftmost is not None and leftmost.dotted in self.known:
            start = text.find(item.node.operator, leftmost.span.end_column - 1)
            sentence = f"`{leftmost.dotted}` is a word here, and a sign touches its value"
            hint = f"write `{item.node.operator}` close to the value behind it"
            return Slip("sign-space", start, start + 1, sentence, hint)
        if before is None:
            return None
        wants_words = all(isinstance(element, Literal) for element in self.account.elements)
        if text[item.start : item.start + 1] == "-" and (wants_words or not before.word):
            return sign_slip(item.start)
        is_open = item.kind == "OPEN" and item.start > before.end
        if is_open and before.word and before.word not in self.known and self.account.is_leftover:
            sentence = "the parenthesis of a call touches its name"
            place = f", or `{before.word} at (` for a place" if "at" in self.known else ""
            return Slip("call-space", before.end, item.start + 1, sentence, f"write `{before.word}(`{place}")
        is_word = bool(item.word) and item.word not in self.words.homes and not nearest(item.word, self.known)
        if is_word and before.kind == "NUMBER":
            return unit_slip(text, ("NUMBER", before.start, before.end), item.start, item.end)
        return None

    def swallowed_word(self) -> Slip | None:
        """A word taken for a value, because the value before it was left out: `diameter length 4 mm`."""
        before = self.before
        if before is None or not before.word or self.at < 2 or (self.item is not None and self.item.word):
            return None
        if before.word not in self.known:
            return None
        behind = self.raw.items[self.at - 2]
        shown = self.raw.text[behind.start : behind.end]
        if not behind.word:
            return None
        sentence = f"expected a value behind `{shown}`, found the word `{before.word}`"
        return Slip("missing-value", behind.end, behind.end, sentence, self.example())

    def unknown_shape(self) -> Slip | None:
        """A word that is no shape is read as a part, and what follows does not fit a part."""
        before, item = self.before, self.item
        if before is None or not before.word or item is None or not self.account.is_leftover:
            return None
        pattern = self.account.pattern
        above = self.raw.items[self.at - 2].word if self.at >= 2 else ""
        is_group = self.at == 1 and pattern is not None and "group" in pattern.row.stands
        if before.word in self.things or not (is_group or above in ("add", "cut", "keep")):
            return None
        if nearest(item.word, self.known) and not shape_meant(before.word):
            return None
        what = "no part is called so" if item.kind == "OPEN" else "a part takes nothing like what follows it"
        sentence = f"`{before.word}` is no shape, and {what}"
        return Slip("unknown-word", before.start, before.end, sentence, shape_hint(before.word, self.things))

    # --- words and values

    def missing(self) -> Problem:
        """The line ends where more is needed."""
        span = self.raw.place.span(self.raw.end, self.raw.end)
        return self.make(
            "missing-value", span, f"expected {self.wanted()} behind {self.shown_before()}", self.example()
        )

    def wrong_word(self, item: Item) -> Problem:
        """A word that the place does not know, or does not take."""
        span = self.raw.place.span(item.start, item.end)
        if self.wants_setting():
            place = self.raw.place.span(item.end, item.end)
            return self.make("missing-value", place, f"expected `=` and a value behind `{item.word}`", self.example())
        near = nearest(item.word, self.known)
        if near and near != item.word:
            sentence = f"`{item.word}` is not a word that stands here"
            return self.make("unknown-word", span, sentence, f"did you mean `{near}`?")
        if self.account.elements and not self.account.is_leftover:
            return self.other_word(item, span)
        early = self.too_late(item.word)
        if early:
            hint = f"`{item.word}` comes before `{early}`"
            return self.make("misplaced-word", span, f"`{item.word}` may not stand here", hint)
        homes = [PLACES[home] for home in self.words.homes.get(item.word, ())]
        if homes:
            hint = f"it stands {_listed(dict.fromkeys(homes))}{self.by_material(item.word)}"
            return self.make("misplaced-word", span, f"`{item.word}` may not stand here", hint)
        everywhere = nearest(item.word, self.words.homes) if len(item.word) > 3 else ""
        if everywhere:
            homes = [PLACES[home] for home in self.words.homes[everywhere]]
            hint = f"`{everywhere}` stands {_listed(dict.fromkeys(homes))}{self.by_material(everywhere)}"
        elif self.known:
            hint = f"here may stand {_listed([f'`{word}`' for word in self.words_today()[:12]])}"
        else:
            hint = self.example()
        return self.make("unknown-word", span, f"`{item.word}` is not a word that stands here", hint)

    def other_word(self, item: Item, span: Span) -> Problem:
        """A word where another is wanted: one of the same row that comes later, with a slip or without, or none."""
        said = {before.word for before in self.raw.items[: self.at]}
        comes = [word for row in self.rows for word in _literals(row.elements) if word not in said]
        first = next((element.text for element in self.elements if isinstance(element, Literal)), "")
        meant = item.word if item.word in comes else nearest(item.word, comes)
        sentence = f"expected {self.wanted()} behind {self.shown_before()}, found `{item.word}`"
        hint = self.example()
        if first and meant and meant != item.word:
            sentence = f"`{item.word}` is not a word that stands here"
            return self.make("unknown-word", span, sentence, f"did you mean `{meant}`? `{first}` comes before it")
        if first and meant:
            hint = f"`{first}` comes before `{meant}`: {hint}"
        elif first == "diameter" and item.word == "radius":
            hint = f"sizes are diameters, twice the radius: {hint}"
        return self.make("missing-value", self.gap(span), sentence, hint)

    def too_late(self, word: str) -> str:
        """The word said already before which a word of the same shape should have stood, or ""."""
        said = [before.word for before in self.raw.items[: self.at] if before.word]
        shape = next((each for each in said if each in SHAPE_WORDS), "")
        for pattern in self.words.places["shape"].by_word.get(shape, ()):
            words = list(_literals(pattern.elements))
            if word in words and word not in said:
                return next((each for each in words[words.index(word) + 1 :] if each in said), "")
        return ""

    def by_material(self, word: str) -> str:
        """The way from a part to a word of materials, to end a hint."""
        is_far = "made" in self.known and "material" in self.words.homes.get(word, ())
        return "; a part takes its material by `made of`" if is_far else ""

    def words_today(self) -> list[str]:
        """The words that could have stood there and are drawn today, or all where none is."""
        later = {
            word
            for starts in self.account.starts
            for word, rows in starts.by_word.items()
            if all(row.row.later for row in rows)
        }
        return [word for word in self.known if word not in later] or self.known

    def wrong_value(self, item: Item) -> Problem:
        """A value where a word is wanted, of the wrong form, or one too many."""
        span = self.raw.place.span(item.start, item.end)
        if item.node is not None and item.node.span.line != self.raw.place.line:
            span = item.node.span
        shown = f"`{self.raw.text[item.start : item.end]}`" if item.end > item.start else "this text"
        if self.account.elements and not self.account.is_leftover:
            sentence = f"expected {self.wanted()}{self.behind()}, found {shown}"
            if all(isinstance(element, Literal) for element in self.account.elements):
                return self.make("missing-value", self.gap(span), sentence, self.example())
            return self.make("wrong-form", span, sentence, self.form_hint(item) or self.example())
        if self.before is None:
            return self.make("wrong-form", span, f"expected a word that starts a line, found {shown}")
        return self.make("value-too-many", span, f"nothing takes {shown} here", self.example())

    def form_hint(self, item: Item) -> str:
        """How to write a value whose form betrays what was meant."""
        if isinstance(item.node, Equation):
            return "equality is written `is`"
        if not isinstance(item.node, Series):
            return ""
        last = plain_name(item.node.entries[-1])
        if last in self.words.homes:
            return f"no comma stands before the word `{last}`"
        kinds = {element.kind for element in self.account.elements if isinstance(element, Slot)}
        return "put the values in parentheses" if kinds & {"point", "point2", "vector", "direction"} else ""

    # --- parts of messages

    def wants_setting(self) -> bool:
        """Whether a setting is expected and nothing else."""
        elements = self.account.elements
        return bool(elements) and all(isinstance(element, Equals) for element in elements)

    def make(self, code: str, span: Span, sentence: str, hint: str = "") -> Problem:
        """An error."""
        return Problem(code, Severity.ERROR, span, sentence, hint)

    def gap(self, otherwise: Span) -> Span:
        """The end of what stands before, where something is missing."""
        return otherwise if self.before is None else self.raw.place.span(self.before.end, self.before.end)

    def behind(self) -> str:
        """Where the mistake is, for a sentence."""
        return f" behind {self.shown_before()}" if self.before is not None else ""

    def shown_before(self) -> str:
        """What stands before, in quotes."""
        if self.before is None:
            return "this"
        return f"`{self.raw.text[self.before.start : self.before.end]}`"

    def wanted(self) -> str:
        """What could have stood there, for people."""
        wanted = [_describe(element) for element in self.elements]
        return _listed(dict.fromkeys(wanted)) or "a word of the language"

    def example(self) -> str:
        """An example of the row that was being read."""
        pattern = self.rows[0] if self.rows and not self.account.is_leftover else self.account.pattern
        return f"for example `{pattern.row.example}`" if pattern is not None and pattern.row.example else ""


def _literals(elements: tuple[Element, ...]) -> Iterator[str]:
    """The words of a row, those of alternatives and of what may be left out too."""
    for element in elements:
        if isinstance(element, Literal):
            yield element.text
        elif isinstance(element, Optional):
            yield from _literals(element.elements)
        elif isinstance(element, Either):
            for branch in element.branches:
                yield from _literals(branch)


def _leftmost(node: object) -> Path | None:
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
    return "a setting, `name = value`" if element.left.kind in ("new", "signature") else "a measure and its value"


def _listed(names: Iterable[str]) -> str:
    known = list(names)
    if len(known) < 2:
        return "".join(known)
    return f"{', '.join(known[:-1])} or {known[-1]}"
