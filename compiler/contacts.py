"""What stands oddly in a model: a part that touches nothing it is placed with, a model of no likely size.

Judged on the meshes of the proof, so nearer than their chord errors counts as touching. Boxes decide first; meshes are
finished and gaps measured only where they meet. The work is bounded, and what a bound leaves open is said.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from itertools import islice

import manifold3d
import numpy as np
from msgspec import Struct, field
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind
from platewright.lang.problems import Problem

from .flatten import Prover, proof_rung
from .graph import Assembly, Occurrence, Solid, Thing
from .mistakes import Problems
from .solids.boxes import meeting_at_most
from .solids.recipe import Point3, Recipe
from .solids.transform import largest_scale

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

SMALLEST_MODEL = 0.1
"""mm; a smaller model is likely to be given in a wrong unit."""
LARGEST_MODEL = 100_000.0
"""mm; so is a larger one."""
MOST_GAPS = 1_500
"""Gaps measured in one model, between parts of few triangles; one between parts of `_WEIGHT` counts twice."""
_WEIGHT = 800
MOST_PAIRS = 3_000_000
"""Pairs of copies in one assembly whose boxes meet."""
_FLUSH = 1e-6
"""Of its size: flat parts nearer than this touch."""


def check_sizes(roots: Iterable[Thing], leaves: Leaves) -> tuple[Problem, ...]:
    """Warnings for whole models under 0.1 mm or over 100 m."""
    problems = Problems()
    for root in roots:
        found = leaves.of(root)
        reach = float((found.high.max(axis=0) - found.low.min(axis=0)).max()) if len(found.solids) else 1.0
        hint = "check its units, or accept it by the code of this warning"
        if 0.0 < reach < SMALLEST_MODEL:
            problems.warn("tiny-model", root.span, f"the whole of `{root.name}` is only {reach:g} mm long", hint)
        if reach > LARGEST_MODEL:
            problems.warn("huge-model", root.span, f"the whole of `{root.name}` is {reach / 1000:g} m long", hint)
    return problems.all()


def check_contacts(things: Sequence[Thing], leaves: Leaves, mesher: Prover) -> tuple[Problem, ...]:
    """Warnings for copies that touch nothing else placed in their assembly, one for each `place` line, or one for all;
    and where not every copy could be judged.

    Cost: a tree of the boxes of all copies, and at most `MOST_GAPS` gaps between meshes of the proof.
    """
    problems, contacts = Problems(), _Contacts(mesher, leaves)
    for assembly in _assemblies(things):
        n_copies = sum(len(occurrence.copies) for occurrence in assembly.occurrences)
        floating, n_open = contacts.floating(assembly)
        if n_open:
            sentence = (
                f"whether {n_open} of the {n_copies} things placed in `{assembly.name}` touch another is not judged"
            )
            hint = 'it would take too many gaps to be measured; say `accept "unjudged-contacts"` where it is known'
            problems.warn("unjudged-contacts", assembly.span, sentence, hint)
        _report(assembly, floating, n_copies, problems)
    return problems.all()


def _report(assembly: Assembly, floating: list[tuple[Occurrence, int]], n_copies: int, problems: Problems) -> None:
    hint = 'move it, or say `accept "floating-part"` where it is meant'
    if floating and sum(n for _, n in floating) == n_copies:
        sentence = f"none of the {n_copies} things placed in `{assembly.name}` touches another"
        problems.warn("floating-part", assembly.span, sentence, hint.replace("move it", "move them"))
        return
    for occurrence, n_floating in floating:
        n = len(occurrence.copies)
        named = f"`{occurrence.name}`" if n == 1 else f"{n_floating} of the {n} copies of `{occurrence.name}`"
        verb = "touches" if n_floating == 1 else "touch"
        problems.warn("floating-part", occurrence.span, f"{named} {verb} nothing else in `{assembly.name}`", hint)


def _assemblies(things: Sequence[Thing]) -> list[Assembly]:
    seen: dict[int, Thing] = {}
    pending = list(reversed(things))
    while pending:
        thing = pending.pop()
        if id(thing) not in seen:
            seen[id(thing)] = thing
            if isinstance(thing, Assembly):
                pending.extend(copy.thing for each in reversed(thing.occurrences) for copy in reversed(each.copies))
    return [thing for thing in seen.values() if isinstance(thing, Assembly)]


class _Placed(Struct, frozen=True, eq=False):
    """Solids below a thing: placements (k,3,4) in its frame, boxes low (k,3) and high (k,3)."""

    solids: tuple[Solid, ...]
    placements: F64
    low: F64
    high: F64


class Leaves(Struct):
    """The solids below things, worked out once for each thing. Things hold each other at most `limits.NESTING` deep.

    `box` gives the box of a recipe.
    """

    box: Callable[[Recipe], tuple[Point3, Point3]]
    known: dict[int, _Placed] = field(default_factory=dict)

    def of(self, thing: Thing) -> _Placed:
        """All solids below a thing."""
        if id(thing) not in self.known:
            self.known[id(thing)] = self._solid(thing) if isinstance(thing, Solid) else self._assembly(thing)
        return self.known[id(thing)]

    def _solid(self, solid: Solid) -> _Placed:
        low, high = self.box(solid.recipe)
        return _Placed((solid,), np.eye(3, 4)[None], np.array([low]), np.array([high]))

    def _assembly(self, assembly: Assembly) -> _Placed:
        parts = [self.copy(copy.thing, copy.placement) for each in assembly.occurrences for copy in each.copies]
        return _Placed(
            tuple(solid for part in parts for solid in part.solids),
            np.concatenate([np.empty((0, 3, 4)), *(part.placements for part in parts)]),
            np.concatenate([np.empty((0, 3)), *(part.low for part in parts)]),
            np.concatenate([np.empty((0, 3)), *(part.high for part in parts)]),
        )

    def copy(self, thing: Thing, placement: Sequence[Sequence[float]]) -> _Placed:
        """All solids below a placed copy, in the frame it is placed in."""
        inner, outer = self.of(thing), np.array(placement, np.float64)
        placements = outer[:, :3] @ inner.placements
        placements[:, :, 3] += outer[:, 3]
        middle = (inner.low + inner.high) / 2 @ outer[:, :3].T + outer[:, 3]
        reach = (inner.high - inner.low) / 2 @ np.abs(outer[:, :3]).T
        return _Placed(inner.solids, placements, middle - reach, middle + reach)


class _Contacts(Struct):
    mesher: Prover
    leaves: Leaves
    gaps: int = MOST_GAPS
    known: dict[tuple[int, int, bytes], bool] = field(default_factory=dict)
    solids: dict[int, tuple[manifold3d.Manifold | None, float]] = field(default_factory=dict)

    def floating(self, assembly: Assembly) -> tuple[list[tuple[Occurrence, int]], int]:
        """Lines of which some copies touch nothing and how many; and how many copies a bound leaves open."""
        copies = [(each, copy) for each in assembly.occurrences for copy in each.copies]
        if len(copies) < 2:
            return [], 0
        placed = [self.leaves.copy(copy.thing, copy.placement) for _, copy in copies]
        if any(not len(each.solids) for each in placed):
            return [], 0
        low = np.array([each.low.min(axis=0) for each in placed])
        high = np.array([each.high.max(axis=0) for each in placed])
        reach = np.array([max(self._nearest(solid) for solid in set(each.solids)) for each in placed])[:, None]
        pairs = meeting_at_most(low - reach, high + reach, MOST_PAIRS)
        if pairs is None:
            return [], len(copies)
        turn = np.concatenate([np.arange(len(each.copies)) for each in assembly.occurrences])
        found = self._judged(placed, (low, high), pairs, turn)
        touches = iter(found)
        floats = [sum(touch is False for touch in islice(touches, len(each.copies))) for each in assembly.occurrences]
        lines = [(each, n) for each, n in zip(assembly.occurrences, floats, strict=True) if n]
        return lines, found.count(None)

    def _judged(
        self, placed: Sequence[_Placed], box: tuple[F64, F64], pairs: tuple[I64, I64], turn: I64
    ) -> list[bool | None]:
        """Whether each copy touches another, None where a bound leaves it open. Pairs are those whose boxes meet.

        The first copy of every line comes first, then the second: where the bound ends, copies like many others remain.
        """
        low, high = box
        one, other = np.concatenate(pairs), np.concatenate(pairs[::-1])
        shared = (np.minimum(high[one], high[other]) - np.maximum(low[one], low[other])).min(axis=1)
        order = np.lexsort((other, -shared, one))
        one, other = one[order], other[order]
        first = np.searchsorted(one, np.arange(len(placed) + 1))
        found: list[bool | None] = [False] * len(placed)
        with_some = np.flatnonzero(first[1:] > first[:-1])
        for k in with_some[np.argsort(turn[with_some], kind="stable")].tolist():
            if found[k]:
                continue
            for each in other[first[k] : first[k + 1]].tolist():
                touch = self._touch(placed[k], placed[each])
                if touch:
                    found[k] = found[each] = True
                    break
                if touch is None:
                    found[k] = None
        return found

    def _touch(self, one: _Placed, other: _Placed) -> bool | None:
        near = np.array([self._near(solid) for solid in one.solids])
        also = np.array([self._near(solid) for solid in other.solids])
        found: bool | None = False
        for k in range(len(one.solids)):
            meets = _meets(other.low, other.high, one.low[k], one.high[k], near[k] + also)
            for j in np.flatnonzero(meets).tolist():
                meet = self._meet(one, k, other, j)
                if meet:
                    return True
                if meet is None:
                    found = None
        return found

    def _meet(self, one: _Placed, k: int, other: _Placed, j: int) -> bool | None:
        """Whether two solids touch; None where no more gaps may be measured."""
        a, b = one.placements[k], other.placements[j]
        inverse = np.linalg.inv(a[:, :3])
        between = np.column_stack((inverse @ b[:, :3], inverse @ (b[:, 3] - a[:, 3])))
        key = (id(one.solids[k]), id(other.solids[j]), (np.round(between, 7) + 0.0).tobytes())
        if key not in self.known:
            if self.gaps < 0:
                return None
            solids = [self._solid(one.solids[k]), self._solid(other.solids[j])]
            if solids[0][0] is None or solids[1][0] is None:
                return True
            self.gaps -= 1 + (solids[0][0].num_tri() + solids[1][0].num_tri()) // _WEIGHT
            near = self._near(one.solids[k]) * _scale(a) + self._near(other.solids[j]) * _scale(b)
            gap = solids[0][0].transform(a).min_gap(solids[1][0].transform(b), 2.0 * near)
            self.known[key] = bool(gap <= near)
        return self.known[key]

    def _near(self, solid: Solid) -> float:
        """How near another may be to touch it."""
        return self._solid(solid)[1]

    def _nearest(self, solid: Solid) -> float:
        """At least `_near`, for which no mesh need be finished."""
        low, high = self.leaves.box(solid.recipe)
        size = max(b - a for a, b in zip(low, high, strict=True))
        return max(2.0 * proof_rung(solid.recipe, self.mesher), 2.0 * _FLUSH * size)

    def _solid(self, solid: Solid) -> tuple[manifold3d.Manifold | None, float]:
        """A solid as the boolean kernel has it, and how near another may be to touch it."""
        if id(solid) not in self.solids:
            rung = proof_rung(solid.recipe, self.mesher)
            mesh, _ = self.mesher(solid.recipe, rung)
            made, near = None, rung
            if mesh is not None:
                faces = mesh.faces.astype(np.uint64)
                made = manifold3d.Manifold(manifold3d.Mesh64(np.ascontiguousarray(mesh.vertices), faces))
                is_flat = bool((mesh.patches.kind == PatchKind.PLANE).all())
                near = _FLUSH * float(np.ptp(mesh.vertices, axis=0).max()) if is_flat else 2.0 * rung
            self.solids[id(solid)] = made, near
        return self.solids[id(solid)]


def _scale(placement: F64) -> float:
    a, b, c = placement.tolist()
    return largest_scale((tuple(a), tuple(b), tuple(c)))


def _meets(low: F64, high: F64, other_low: F64, other_high: F64, near: F64) -> NDArray[np.bool_]:
    """Which boxes (k,3) another one meets, or passes within `near` (k,)."""
    reach = near[:, None]
    return np.asarray((low <= other_high + reach).all(axis=1) & (high >= other_low - reach).all(axis=1))
