"""A recipe to a mesh: the whole tree of steps in one boolean evaluation, every face knowing where it comes from.

The boolean kernel keeps, for every triangle, which original it was cut from (run), the placement of that original,
whether the solid lies behind it, and a face number of ours: the row of the original's surface. From these the
analytic surface of every face follows, and from it patches and normals (`finish`).
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import manifold3d
import numpy as np
from manifold3d import Manifold, OpType
from numpy.typing import NDArray
from platewright.backend.contract import Mesh

from . import transform
from .blank import Blank, Blanks, blank, imported
from .finish import finish
from .flaw import Flaw, SolidError
from .ladder import MAX_COPIES, MAX_DEPTH, MAX_TRIANGLES
from .levels import Levels
from .provenance import Leaf, stand_apart, traced
from .recipe import Affine, Placed, Primitive, Recipe
from .shell import Shell
from .surfaces import place, placed_normals
from .tessellate import count_triangles, problems_of, rise
from .topology import SPECK

F64 = NDArray[np.float64]

BUILD_VERSION = 1
"""Part of every mesh's key; changes when the same recipe gives other triangles."""
VOLUME_SLACK = 1e-9
"""Volumes may leave the bounds of set algebra by this part of what was added: rounding, nothing more."""


def build(recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
    """Build one part at a chord error of `rung` mm, in the part's frame: `combine`, finished.

    Returns None with at least one error among the flaws, or a mesh with warnings at most. Flaws: `too-large`,
    `nothing-to-cut`, `empty-part`, `several-pieces` (warning), `boolean-failed`, and those of outlines
    (`no-area`, `outline-crosses-itself`, `hole-outside`, `negative-radius`) and `torus-meets-itself`.
    SolidError means that the recipe should have been refused before. The same recipe and rung give the same bytes.
    """
    unfinished, flaws = combine(recipe, rung, blank)
    return None if unfinished is None else unfinished.mesh(), flaws


class Unfinished(NamedTuple):
    """A sound solid, put together: about as many triangles as its mesh will have, and what makes that mesh."""

    n_faces: int
    mesh: Callable[[], Mesh]


def combine(recipe: Recipe, rung: float, blanks: Blanks) -> tuple[Unfinished | None, tuple[Flaw, ...]]:
    """All of `build` but for the mesh, which is made when it is called for. Flaws and bytes are those of `build`,
    whatever keeps the `blanks` that are asked for.
    """
    flaws = _before(recipe, rung)
    if flaws:
        return None, flaws
    only = _only_shape(recipe)
    if only is not None:
        placed, alone = only
        shell = blanks(alone, rung / transform.largest_scale(placed.placements[0])).shell
        return Unfinished(len(shell.faces), lambda: _from_shell(key_of(recipe, rung), placed, shell)), ()
    workshop = _Workshop(rung, blanks)
    whole = workshop.make(recipe, 1.0, is_outermost=True)
    surfaces = [] if whole.manifold.is_empty() else [_Piece.of(each) for each in whole.manifold.decompose()]
    speck = SPECK * _size(whole.manifold)
    pieces = [each for each in surfaces if not abs(each.volume) <= speck * each.area]
    flaws = (*workshop.flaws, *_after(whole, pieces, len(surfaces) == 1, recipe))
    if any(flaw.is_error for flaw in flaws):
        return None, flaws
    has_specks = len(pieces) < len(surfaces)
    solid, leaves = whole.manifold, tuple(workshop.leaves)
    return Unfinished(solid.num_tri(), lambda: traced(key_of(recipe, rung), solid, leaves, has_specks)), flaws


def key_of(recipe: Recipe, rung: float) -> str:
    """The content hash that names the mesh: sha256 of build version, rung and recipe, 64 hexadecimal digits."""
    return hashlib.sha256(f"{BUILD_VERSION} {rung!r} {recipe!r}".encode()).hexdigest()


class _Piece(NamedTuple):
    """A connected surface of a solid: the volume that it encloses, negative for a cavity, and its area."""

    volume: float
    area: float

    @classmethod
    def of(cls, solid: Manifold) -> _Piece:
        return cls(solid.volume(), solid.surface_area())


@dataclass(frozen=True, eq=False, slots=True)
class _Body:
    """A solid in some frame: its manifold, the planes whose heights may have to agree with others', bounds on its
    volume by set algebra, and a box (2,3) round all shapes it is made of.
    """

    manifold: Manifold
    planes: F64
    volume: tuple[float, float]
    box: F64


@dataclass(frozen=True, eq=False, slots=True)
class _Group:
    """A body at several placements (n,3,4)."""

    body: _Body
    placements: F64

    def manifolds(self, to_correct: NDArray[np.bool_], correct: Callable[[F64], F64]) -> Iterator[Manifold]:
        for placement, is_off in zip(self.placements, to_correct, strict=True):
            moved = _moved(self.body.manifold, placement)
            yield moved.warp_batch(correct) if is_off else moved

    def box(self) -> F64:
        """A box (2,3) round all copies."""
        middle, half = self.body.box.mean(axis=0), np.ptp(self.body.box, axis=0) / 2.0
        centre = self.placements[:, :, :3] @ middle + self.placements[:, :, 3]
        reach = np.abs(self.placements[:, :, :3]) @ half
        return np.array(((centre - reach).min(axis=0), (centre + reach).max(axis=0)))

    def volumes(self) -> tuple[float, float]:
        """Bounds on what the copies fill together: at least the largest of them, at most their sum."""
        size = np.abs(np.linalg.det(self.placements[:, :, :3]))
        return self.body.volume[0] * float(size.max()), self.body.volume[1] * float(size.sum())


@dataclass(slots=True)
class _Workshop:
    """One evaluation: blanks by shape and scale, bodies by recipe and scale, leaves in the order made."""

    rung: float
    blanks: Blanks
    leaves: list[Leaf] = field(default_factory=list)
    flaws: list[Flaw] = field(default_factory=list)
    _blanks: dict[tuple[Primitive, float], Blank] = field(default_factory=dict)
    _sharing: dict[int, list[Leaf]] = field(default_factory=dict)
    _bodies: dict[tuple[int, float], _Body] = field(default_factory=dict)

    def make(self, recipe: Recipe, grown: float, *, is_outermost: bool = False) -> _Body:
        """The solid of a recipe that will be scaled by `grown` at most when it reaches the part."""
        if (id(recipe), grown) not in self._bodies:
            self._bodies[id(recipe), grown] = self._made(recipe, grown, is_outermost)
        return self._bodies[id(recipe), grown]

    def _made(self, recipe: Recipe, grown: float, is_outermost: bool) -> _Body:
        steps = [
            (step.operation, [group for placed in step.placed for group in self._groups(placed, grown, is_outermost)])
            for step in recipe.steps
        ]
        levels = Levels([(group.body.planes, group.placements) for _, groups in steps for group in groups])
        # Of the whole part nobody asks for planes, and for a box only what is kept.
        needs_box = not is_outermost or any(operation == "keep" for operation, _ in steps)
        box = _common_box([group.box() for _, groups in steps for group in groups] if needs_box else [])
        solid, low, high, n = Manifold(), 0.0, 0.0, 0
        for operation, groups in steps:
            if not groups:
                continue
            operands: list[Manifold] = []
            for group in groups:
                operands.extend(group.manifolds(levels.to_correct(n), levels.correct))
                n += 1
            solid = self._kept(solid, operands, box) if operation == "keep" else _combined(solid, operation, operands)
            low, high = _volume_bounds(low, high, operation, groups)
        return _Body(solid, np.zeros((0, 6)) if is_outermost else levels.planes(), (low, high), box)

    def _kept(self, solid: Manifold, operands: list[Manifold], box: F64) -> Manifold:
        """What remains when the rest of a box round everything is cut away: the intersection leaves sheets of no
        thickness where solids touch, its difference does not. Where solids share faces either may go wrong, so each is
        held to the other, and where they differ to what a cut would take away.
        """
        margin = np.ptp(box, axis=0).max() / 4.0
        around = Manifold.cube((np.ptp(box, axis=0) + 2.0 * margin).tolist()).translate((box[0] - margin).tolist())
        kept = solid - Manifold.batch_boolean([around, *operands], OpType.Subtract)
        others = Manifold.batch_boolean(operands, OpType.Add)
        crossed, slack = solid ^ others, VOLUME_SLACK * solid.volume()
        if abs(kept.volume() - crossed.volume()) <= slack:
            return kept
        taken = solid.volume() - (solid - others).volume()
        best = min((kept, crossed), key=lambda each: abs(each.volume() - taken))
        if abs(best.volume() - taken) > slack:
            found = f"{best.volume():.6g} mm3 is kept where a cut takes {taken:.6g} mm3 away"
            self.flaws.append(
                Flaw("boolean-failed", -1, f"the shapes could not be combined: {found}", "please report it")
            )
        return best

    def _groups(self, placed: Placed, grown: float, is_outermost: bool) -> Iterator[_Group]:
        """The shape at its placements, one group for each scale: what grows needs a finer division."""
        if not placed.placements:
            return
        lift = -rise(placed.shape) / 2 if placed.centred and not isinstance(placed.shape, Recipe) else 0.0
        placements = settled(placed.placements, lift)
        scales = transform.largest_scales(placements)
        for scale in sorted(set(scales.tolist())):
            some = placements[scales == scale]
            yield _Group(self._body(placed, some, grown * scale, is_outermost), some)

    def _body(self, placed: Placed, placements: F64, grown: float, is_outermost: bool) -> _Body:
        shape = placed.shape
        if isinstance(shape, Recipe):
            body = self.make(shape, grown)
            if any(step.operation != "add" for step in shape.steps) and body.manifold.is_empty():
                sentence = "nothing is left of the part that is used here"
                self.flaws.append(Flaw("empty-part", placed.source, sentence, "look at its cuts"))
            return body
        if (shape, grown) not in self._blanks:
            self._blanks[shape, grown] = self.blanks(shape, self.rung / grown)
        made = self._blanks[shape, grown]
        solid = self._solid(made, placed.source, placements, is_outermost)
        return _Body(solid, made.planes, (made.volume, made.volume), made.box)

    def _solid(self, made: Blank, source: int, placements: F64, is_outermost: bool) -> Manifold:
        """The blank as the kernel has it, noted as a leaf. It is imported again where two lines could not be told
        apart: by its place a copy is known only in the frame of the whole part, and only if it is not made anew.
        """
        solid, number = made.solid
        leaf = Leaf(number, source, made.shell, placements)
        may_share = is_outermost and made.shell.normals is None
        if number not in self._sharing:
            self._sharing[number] = [leaf] if may_share else []
        elif may_share and self._sharing[number] and stand_apart(leaf, self._sharing[number]):
            self._sharing[number].append(leaf)
        else:
            number = Manifold.reserve_ids(1)
            solid, leaf = imported(made.shell, number), Leaf(number, source, made.shell, placements)
        self.leaves.append(leaf)
        return solid


def settled(placements: Sequence[Affine], lift: float = 0.0) -> F64:
    """Placements (n,3,4) with `lift` along the shape's own z before them, and shifts that are a rounding error away
    from a decimal of six places set to it, so that 0.1 + 0.2 stands where 0.3 does.
    """
    settled = np.array(placements, np.float64).reshape(-1, 3, 4)
    shift = settled[:, :, 3]
    if lift:
        shift += settled[:, :, 2] * lift
    decimal = np.round(shift, 6)
    near = np.abs(shift - decimal) <= 1e-14 * np.maximum(1.0, np.abs(shift).max(axis=1, initial=0.0))[:, None]
    shift[near] = decimal[near]
    return settled


def _before(recipe: Recipe, rung: float) -> tuple[Flaw, ...]:
    """Budgets and the mistakes of single shapes; nothing is tessellated."""
    copies, triangles = _totals(recipe, rung, {})
    hint = "use fewer copies or a coarser chord error"
    if copies > MAX_COPIES:
        return (
            Flaw("too-large", -1, f"the part is made of more than {MAX_COPIES} shapes, the limit named `copies`", hint),
        )
    if triangles > MAX_TRIANGLES:
        sentence = f"the part would take more than {MAX_TRIANGLES} triangles, the limit named `triangles`"
        return (Flaw("too-large", -1, sentence, hint),)
    found: dict[Flaw, None] = {}
    judged: dict[Primitive, tuple[tuple[str, str, str], ...]] = {}
    for placed in _all_placed(recipe, set()):
        if isinstance(placed.shape, Recipe):
            continue
        if placed.shape not in judged:
            judged[placed.shape] = tuple((p.code, p.sentence, p.hint) for p in problems_of(placed.shape))
        for code, sentence, hint in judged[placed.shape]:
            found[Flaw(code, placed.source, sentence, hint)] = None
    first = next((step for step in recipe.steps if step.placed), None)
    if first is not None and first.operation != "add":
        sentence = f"the part begins with a {first.operation}, but there is nothing to {first.operation} yet"
        found[Flaw("nothing-to-cut", first.placed[0].source, sentence, "add a shape first")] = None
    return tuple(found)


def _totals(recipe: Recipe, rung: float, known: dict[int, tuple[int, int]], depth: int = 1) -> tuple[int, int]:
    """Shapes and triangles with all copies; a recipe used twice is counted twice but walked once."""
    if depth > MAX_DEPTH:
        return MAX_COPIES + 1, 0
    if id(recipe) not in known:
        copies = triangles = 0
        for step in recipe.steps:
            for placed in step.placed:
                n = max(1, len(placed.placements))
                if n > MAX_COPIES:
                    return n, 0
                if isinstance(placed.shape, Recipe):
                    inner = _totals(placed.shape, rung, known, depth + 1)
                else:
                    inner = 1, count_triangles(placed.shape, rung / _largest_scale(placed))
                copies += n * inner[0]
                triangles += n * inner[1]
        # An empty recipe counts as one, so that no nest of them is larger than the budget.
        known[id(recipe)] = max(1, copies), triangles
    return known[id(recipe)]


def _largest_scale(placed: Placed) -> float:
    if not placed.placements:
        return 1.0
    placements = np.array(placed.placements)
    if not np.isfinite(placements).all() or not np.linalg.det(placements[:, :, :3]).all():
        raise SolidError("a placement is not finite, or flattens")
    return float(transform.largest_scales(placements).max())


def _all_placed(recipe: Recipe, seen: set[int]) -> Iterator[Placed]:
    if id(recipe) in seen:
        return
    seen.add(id(recipe))
    for step in recipe.steps:
        for placed in step.placed:
            yield placed
            if isinstance(placed.shape, Recipe):
                yield from _all_placed(placed.shape, seen)


def _only_shape(recipe: Recipe) -> tuple[Placed, Primitive] | None:
    """The one shape that the recipe adds, if that is all it does: no boolean is needed."""
    placed = [placed for step in recipe.steps for placed in step.placed]
    if len(placed) != 1 or len(placed[0].placements) != 1 or isinstance(placed[0].shape, Recipe):
        return None
    return placed[0], placed[0].shape


def _from_shell(key: str, placed: Placed, shell: Shell) -> Mesh:
    assert not isinstance(placed.shape, Recipe)
    placement = placed.placements[0]
    lift = -rise(placed.shape) / 2 if placed.centred else 0.0
    (array,) = settled((placement,), lift)
    placement = transform.from_matrix(array)
    faces = shell.faces if transform.determinant(placement) > 0.0 else np.ascontiguousarray(shell.faces[:, ::-1])
    vertices = shell.vertices if placement == transform.IDENTITY else transform.apply(placement, shell.vertices) + 0.0
    source = np.full(len(faces), placed.source, np.int32)
    free = None
    if shell.normals is not None:
        normals = shell.normals if faces is shell.faces else shell.normals[:, ::-1]
        free = placed_normals(array, normals)
    return finish(key, vertices, faces, shell.face_surface, source, place(shell.surfaces, array), free)


def _moved(solid: Manifold, placement: F64) -> Manifold:
    """A solid at a placement (3,4). The kernel gives the properties of a mirrored triangle to the wrong corners
    (manifold3d 3.x), so a solid with normals is mirrored here.
    """
    if solid.num_prop() == 0 or np.linalg.det(placement[:, :3]) > 0.0:
        return solid.transform(placement)
    mesh = solid.to_mesh64()
    properties = np.array(mesh.vert_properties)
    properties[:, :3] = properties[:, :3] @ placement[:, :3].T + placement[:, 3]
    runs = np.array(mesh.run_transform)
    turned = runs @ placement[:, :3].T
    turned[:, 3] += placement[:, 3]
    mirrored = manifold3d.Mesh64(
        vert_properties=properties,
        tri_verts=np.ascontiguousarray(np.array(mesh.tri_verts)[:, ::-1]),
        merge_from_vert=np.array(mesh.merge_from_vert),
        merge_to_vert=np.array(mesh.merge_to_vert),
        run_index=np.array(mesh.run_index),
        run_original_id=np.array(mesh.run_original_id),
        run_transform=turned,
        run_flags=np.array(mesh.run_flags),
        face_id=np.array(mesh.face_id),
    )
    return Manifold(mirrored)


def _combined(solid: Manifold, operation: str, operands: list[Manifold]) -> Manifold:
    """One step that adds or cuts."""
    return Manifold.batch_boolean([solid, *operands], OpType.Add if operation == "add" else OpType.Subtract)


def _common_box(boxes: list[F64]) -> F64:
    if not boxes:
        return np.zeros((2, 3))
    return np.array((np.min(boxes, axis=0)[0], np.max(boxes, axis=0)[1]))


def _volume_bounds(low: float, high: float, operation: str, groups: list[_Group]) -> tuple[float, float]:
    volumes = [group.volumes() for group in groups]
    total = sum(most for _, most in volumes)
    if operation == "add":
        return max([low, *(least for least, _ in volumes)]), high + total
    if operation == "cut":
        return max(0.0, low - total), high
    return 0.0, min(high, total)


def _after(body: _Body, pieces: list[_Piece], is_one: bool, recipe: Recipe) -> Iterator[Flaw]:
    """What can only be said of the finished solid and its connected surfaces."""
    solid = body.manifold
    if solid.status() != manifold3d.Error.NoError:
        name = solid.status().name
        yield Flaw("boolean-failed", -1, f"the shapes could not be combined: {name}", "please report it")
        return
    if not pieces:
        yield _empty(recipe)
        return
    low, high = body.volume
    volume, slack = pieces[0].volume if is_one else solid.volume(), VOLUME_SLACK * high
    if not low - slack <= volume <= high + slack:
        found = f"{volume:.6g} mm3 is left, between {low:.6g} and {high:.6g} expected"
        yield Flaw("boolean-failed", -1, f"the shapes could not be combined: {found}", "please report it")
    # A cavity is a surface of its own with a negative volume; only what has a positive one is a piece.
    n = sum(1 for piece in pieces if piece.volume > 0.0)
    if n > 1:
        hint = "let its shapes overlap, or make a part of each"
        yield Flaw("several-pieces", -1, f"the part falls into {n} pieces", hint, is_error=False)


def _size(solid: Manifold) -> float:
    """The longest side of the box; 0 of nothing."""
    if solid.is_empty():
        return 0.0
    x0, y0, z0, x1, y1, z1 = solid.bounding_box()
    return float(max(x1 - x0, y1 - y0, z1 - z0))


def _empty(recipe: Recipe) -> Flaw:
    last = next((s for s in reversed(recipe.steps) if s.operation != "add" and s.placed), None)
    if last is None:
        return Flaw("empty-part", -1, "the part has no shape", "add one")
    verb = "cutting" if last.operation == "cut" else "keeping"
    sentence = f"nothing is left of the part after {verb} this"
    return Flaw("empty-part", last.placed[0].source, sentence, "check where it stands and how large it is")
