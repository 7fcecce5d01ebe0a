"""A recipe to a mesh: the whole tree of steps in one boolean evaluation, every face knowing where it comes from.

The boolean kernel keeps, for every triangle, which original it was cut from (run), the placement of that original,
whether the solid lies behind it, and a face number of ours: the row of the original's surface. From these the
analytic surface of every face follows, and from it patches and normals (`finish`).
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field

import manifold3d
import numpy as np
from manifold3d import Manifold, OpType
from numpy.typing import NDArray
from platewright.backend.contract import Mesh

from . import transform
from .finish import finish
from .flaw import Flaw, SolidError
from .ladder import MAX_COPIES, MAX_DEPTH, MAX_TRIANGLES
from .levels import Levels, axis_planes
from .recipe import Affine, Placed, Primitive, Recipe
from .shell import Shell
from .surfaces import Surfaces, concatenate, place, placed_normals
from .tessellate import count_triangles, problems_of, rise, tessellate
from .topology import SPECK, in_use, without_specks

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

BUILD_VERSION = 1
"""Part of every mesh's key; changes when the same recipe gives other triangles."""
VOLUME_SLACK = 1e-9
"""Volumes may leave the bounds of set algebra by this part of what was added: rounding, nothing more."""


def build(recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
    """Build one part at a chord error of `rung` mm, in the part's frame.

    Returns None with at least one error among the flaws, or a mesh with warnings at most. Flaws: `too-large`,
    `nothing-to-cut`, `empty-part`, `several-pieces` (warning), `boolean-failed`, and those of outlines
    (`no-area`, `outline-crosses-itself`, `hole-outside`, `negative-radius`) and `torus-meets-itself`.
    SolidError means that the recipe should have been refused before. The same recipe and rung give the same bytes.
    """
    flaws = _before(recipe, rung)
    if flaws:
        return None, flaws
    only = _only_shape(recipe)
    if only is not None:
        return _from_shell(key_of(recipe, rung), only, rung), ()
    workshop = _Workshop(rung)
    whole = workshop.make(recipe, 1.0)
    surfaces = [] if whole.manifold.is_empty() else whole.manifold.decompose()
    pieces = [piece for piece in surfaces if not _is_speck(piece, whole.manifold)]
    flaws = (*workshop.flaws, *_after(whole, pieces, recipe))
    if any(flaw.is_error for flaw in flaws):
        return None, flaws
    has_specks = len(pieces) < len(surfaces)
    return _from_manifold(key_of(recipe, rung), whole.manifold, workshop.leaves, has_specks), flaws


def key_of(recipe: Recipe, rung: float) -> str:
    """The content hash that names the mesh: sha256 of build version, rung and recipe, 64 hexadecimal digits."""
    return hashlib.sha256(f"{BUILD_VERSION} {rung!r} {recipe!r}".encode()).hexdigest()


@dataclass(frozen=True, eq=False, slots=True)
class _Leaf:
    """An original of the boolean kernel: run `number` is a placed copy of it."""

    number: int
    source: int
    shell: Shell


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
    """One evaluation: shells by shape and scale, bodies by recipe and scale, leaves in the order made."""

    rung: float
    leaves: list[_Leaf] = field(default_factory=list)
    flaws: list[Flaw] = field(default_factory=list)
    _shells: dict[tuple[Primitive, float], tuple[Shell, float]] = field(default_factory=dict)
    _bodies: dict[tuple[int, float], _Body] = field(default_factory=dict)

    def make(self, recipe: Recipe, grown: float) -> _Body:
        """The solid of a recipe that will be scaled by `grown` at most when it reaches the part."""
        if (id(recipe), grown) not in self._bodies:
            self._bodies[id(recipe), grown] = self._made(recipe, grown)
        return self._bodies[id(recipe), grown]

    def _made(self, recipe: Recipe, grown: float) -> _Body:
        steps = [
            (s.operation, [group for placed in s.placed for group in self._groups(placed, grown)]) for s in recipe.steps
        ]
        levels = Levels([(group.body.planes, group.placements) for _, groups in steps for group in groups])
        box = _common_box([group.box() for _, groups in steps for group in groups])
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
        return _Body(solid, levels.planes(), (low, high), box)

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

    def _groups(self, placed: Placed, grown: float) -> Iterator[_Group]:
        """The shape at its placements, one group for each scale: what grows needs a finer division."""
        if not placed.placements:
            return
        lift = -rise(placed.shape) / 2 if placed.centred and not isinstance(placed.shape, Recipe) else 0.0
        placements = settled(placed.placements, lift)
        scales = transform.largest_scales(placements)
        for scale in np.unique(scales):
            yield _Group(self._body(placed, grown * float(scale)), placements[scales == scale])

    def _body(self, placed: Placed, grown: float) -> _Body:
        shape = placed.shape
        if isinstance(shape, Recipe):
            body = self.make(shape, grown)
            if any(step.operation != "add" for step in shape.steps) and body.manifold.is_empty():
                sentence = "nothing is left of the part that is used here"
                self.flaws.append(Flaw("empty-part", placed.source, sentence, "look at its cuts"))
            return body
        if (shape, grown) not in self._shells:
            shell = tessellate(shape, self.rung / grown)
            self._shells[shape, grown] = shell, _volume(shell)
        shell, volume = self._shells[shape, grown]
        number = Manifold.reserve_ids(1)
        self.leaves.append(_Leaf(number, placed.source, shell))
        box = np.array((shell.vertices.min(axis=0), shell.vertices.max(axis=0)))
        return _Body(_import(shell, number), axis_planes(shell.surfaces), (volume, volume), box)


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


def _only_shape(recipe: Recipe) -> Placed | None:
    """The one shape that the recipe adds, if that is all it does: no boolean is needed."""
    placed = [placed for step in recipe.steps for placed in step.placed]
    alone = len(placed) == 1 and len(placed[0].placements) == 1 and not isinstance(placed[0].shape, Recipe)
    return placed[0] if alone else None


def _from_shell(key: str, placed: Placed, rung: float) -> Mesh:
    assert not isinstance(placed.shape, Recipe)
    placement = placed.placements[0]
    lift = -rise(placed.shape) / 2 if placed.centred else 0.0
    shell = tessellate(placed.shape, rung / transform.largest_scale(placement))
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


def _import(shell: Shell, number: int) -> Manifold:
    properties, faces, copies = _with_normals(shell)
    mesh = manifold3d.Mesh64(
        vert_properties=properties,
        tri_verts=faces.astype(np.uint64),
        merge_from_vert=np.flatnonzero(copies != np.arange(len(copies))).astype(np.uint64),
        merge_to_vert=copies[copies != np.arange(len(copies))].astype(np.uint64),
        run_index=np.array([0, faces.size], np.uint64),
        run_original_id=np.array([number], np.uint32),
        face_id=shell.face_surface.astype(np.uint64),
    )
    solid = Manifold(mesh)
    if solid.status() != manifold3d.Error.NoError:
        raise SolidError(f"a shell is not closed: {solid.status()}")
    return solid


def _with_normals(shell: Shell) -> tuple[F64, I64, I64]:
    """Vertices as the kernel takes them (n,3), or (n,6) with normals that it carries over cuts; the faces in them; and
    for each the first that stands at its place. A vertex where free patches meet stands once for each normal.
    """
    if shell.normals is None:
        return shell.vertices, shell.faces.astype(np.int64), np.arange(len(shell.vertices))
    corner = shell.faces.astype(np.int64).ravel()
    normals = np.round(shell.normals.reshape(-1, 3), 12) + 0.0
    order = np.lexsort((normals[:, 2], normals[:, 1], normals[:, 0], corner))
    ordered, by_vertex = normals[order], corner[order]
    is_new = np.ones(len(order), np.bool_)
    is_new[1:] = (by_vertex[1:] != by_vertex[:-1]) | (ordered[1:] != ordered[:-1]).any(axis=1)
    faces = np.empty(len(order), np.int64)
    faces[order] = np.cumsum(is_new) - 1
    vertex = by_vertex[is_new]
    first = np.searchsorted(vertex, vertex)
    return np.concatenate((shell.vertices[vertex], ordered[is_new]), axis=1), faces.reshape(-1, 3), first


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


def _volume(shell: Shell) -> float:
    a, b, c = (shell.vertices[shell.faces[:, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6.0)


def _after(body: _Body, pieces: list[Manifold], recipe: Recipe) -> Iterator[Flaw]:
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
    volume, slack = solid.volume(), VOLUME_SLACK * high
    if not low - slack <= volume <= high + slack:
        found = f"{volume:.6g} mm3 is left, between {low:.6g} and {high:.6g} expected"
        yield Flaw("boolean-failed", -1, f"the shapes could not be combined: {found}", "please report it")
    # A cavity is a surface of its own with a negative volume; only what has a positive one is a piece.
    n = sum(1 for piece in pieces if piece.volume() > 0.0)
    if n > 1:
        hint = "let its shapes overlap, or make a part of each"
        yield Flaw("several-pieces", -1, f"the part falls into {n} pieces", hint, is_error=False)


def _is_speck(piece: Manifold, solid: Manifold) -> bool:
    """Whether a connected surface is what rounding leaves between faces that should have met."""
    box = np.array(solid.bounding_box()).reshape(2, 3)
    return bool(abs(piece.volume()) <= SPECK * np.ptp(box, axis=0).max() * piece.surface_area())


def _empty(recipe: Recipe) -> Flaw:
    last = next((s for s in reversed(recipe.steps) if s.operation != "add" and s.placed), None)
    if last is None:
        return Flaw("empty-part", -1, "the part has no shape", "add one")
    verb = "cutting" if last.operation == "cut" else "keeping"
    sentence = f"nothing is left of the part after {verb} this"
    return Flaw("empty-part", last.placed[0].source, sentence, "check where it stands and how large it is")


def _from_manifold(key: str, solid: Manifold, leaves: list[_Leaf], has_specks: bool) -> Mesh:
    mesh = solid.to_mesh64()
    faces, free = np.asarray(mesh.tri_verts).astype(np.int32), None
    if np.shape(mesh.vert_properties)[1] > 3:
        free = np.asarray(mesh.vert_properties)[:, 3:6][faces]
        same = np.arange(len(mesh.vert_properties), dtype=np.int32)
        same[np.asarray(mesh.merge_from_vert, np.int64)] = np.asarray(mesh.merge_to_vert, np.int32)
        faces = same[faces]
    run_index = np.array(mesh.run_index, np.int64) // 3
    lengths = run_index[1:] - run_index[:-1]
    numbers = np.array([leaf.number for leaf in leaves], np.int64)
    originals = np.array(mesh.run_original_id, np.int64)
    leaf_of_run = np.searchsorted(numbers, originals).clip(max=len(numbers) - 1)
    # A run without triangles may be that of the box round what is kept.
    if (lengths[numbers[leaf_of_run] != originals] > 0).any():
        raise SolidError("a face of no shape of the recipe")
    sizes = np.array([len(leaf.shell.surfaces) for leaf in leaves], np.int64)
    first_of_leaf = np.cumsum(sizes) - sizes
    size_of_run = sizes[leaf_of_run]
    first_of_run = np.cumsum(size_of_run) - size_of_run
    # One row of surfaces for every run and every surface of its original.
    run_of_row = np.repeat(np.arange(len(lengths)), size_of_run)
    within = np.arange(len(run_of_row)) - first_of_run[run_of_row]
    local = concatenate([leaf.shell.surfaces for leaf in leaves]).take(first_of_leaf[leaf_of_run[run_of_row]] + within)
    placements = np.asarray(mesh.run_transform).transpose(0, 2, 1)[run_of_row]
    placed = place(local, placements)
    behind = (np.array(mesh.run_flags, np.uint8) & 1).astype(np.bool_)[run_of_row]
    rows = np.repeat(first_of_run, lengths) + np.array(mesh.face_id, np.int64)
    sources = np.array([leaf.source for leaf in leaves], np.int32)[leaf_of_run]
    vertices = np.ascontiguousarray(mesh.vert_properties[:, :3]) + 0.0
    if free is not None:
        vertices, faces = in_use(vertices, faces)
        run = np.repeat(np.arange(len(lengths)), lengths)
        turned = np.asarray(mesh.run_transform).transpose(0, 2, 1)[run]
        side = np.where(np.array(mesh.run_flags, np.uint8) & 1, -1.0, 1.0)[run]
        free = placed_normals(turned[:, None], free) * side[:, None, None]
    rows, sources = rows.astype(np.int32), np.repeat(sources, lengths)
    if has_specks:
        kept = without_specks(vertices, faces)
        vertices, faces, rows, sources = *in_use(vertices, faces[kept]), rows[kept], sources[kept]
        free = None if free is None else free[kept]
    return finish(
        key,
        vertices,
        faces,
        rows,
        sources,
        Surfaces(placed.kind, placed.affine, placed.ratio, placed.flipped ^ behind),
        free,
    )
