"""Every primitive of a recipe to its shell: one place to add a solid.

Triangles, n = divisions(radius, rung): cylinder 4n - 4; cone 2n - 2, truncated with m < n at its smaller end
4n + 2m - 4 (2n + 2m - 4 if it is short); sphere and ellipsoid n(n - 2); torus 2nm.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from . import sheets, stack
from .along import ALONG, along_flaws, along_shell, count_along, placed_cone, shifted
from .curve import Curve
from .edges import count_edged, edge_flaws, edged
from .envelope import envelope, largest_turn
from .flaw import SolidError
from .ladder import divisions
from .outline import OutlineFlaw, Polyline, count_chords, extent, faults, flatten, oriented, polyline
from .polyhedra import extrude, facets, polyhedron
from .recipe import (
    Bellows,
    Block,
    Cone,
    Cylinder,
    Edged,
    Ellipsoid,
    Envelope,
    Extrude,
    ParametricSurface,
    Placed,
    Point2,
    Primitive,
    Prism,
    Pyramid,
    Recipe,
    Relief,
    Revolve,
    Sphere,
    Spring,
    Thread,
    Torus,
    Transition,
    Wedge,
)
from .revolve import fan_share, revolve
from .shell import Shell
from .surfaces import place
from .thread import count_triangles as count_thread
from .thread import plain, thread
from .transform import apply, largest_scale

F64 = NDArray[np.float64]


def tessellate(shape: Primitive, rung: float) -> Shell:
    """The closed shell of a primitive at a chord error in mm, in its own frame.

    SolidError for sizes that are not positive or outlines that `problems_of` would have refused.
    """
    require_positive(shape)
    if isinstance(shape, Block | Wedge | Prism | Pyramid):
        return polyhedron(*facets(shape))
    if isinstance(shape, Edged):
        return edged(shape, rung)
    if isinstance(shape, Extrude):
        if shape.taper or shape.twist:
            return stack.stack(shape, None, rung)
        return extrude(flatten(shape.outline, rung), shape.length)
    if isinstance(shape, Relief | ParametricSurface):
        return sheets.sheet(shape, rung)
    if isinstance(shape, Envelope):
        inside = [(placed, tessellate(_primitive(placed), rung / _scale(placed))) for placed in shape.placed]
        points = [_moved(placed, made) for placed, made in inside]
        return envelope(points, max(largest_turn(made) for _, made in inside))
    if isinstance(shape, Thread):
        return thread(shape, rung) if shape.real else tessellate(plain(shape), rung)
    if isinstance(shape, Ellipsoid):
        return _ellipsoid(shape, rung)
    if isinstance(shape, ALONG):
        round_one = placed_cone(shape) if isinstance(shape, Transition) else None
        return along_shell(shape, rung) if round_one is None else shifted(tessellate(round_one[0], rung), round_one[1])
    return revolve(_profile(shape, rung), rung, shape.angle if isinstance(shape, Revolve) else 360.0)


def problems_of(shape: Primitive) -> tuple[OutlineFlaw, ...]:
    """Mistakes an author can make in one shape, whatever the rung."""
    if isinstance(shape, Edged):
        return edge_flaws(shape)
    if isinstance(shape, Extrude | Revolve):
        found = faults(shape.outline, isinstance(shape, Revolve))
        if not found and isinstance(shape, Extrude) and shape.taper:
            found = stack.taper_flaws(shape)
        return found
    if isinstance(shape, ALONG):
        return along_flaws(shape)
    if isinstance(shape, Relief | ParametricSurface):
        return sheets.sheet_flaws(shape)
    if isinstance(shape, Envelope):
        return tuple(flaw for placed in shape.placed for flaw in problems_of(_primitive(placed)))
    if isinstance(shape, Torus) and shape.tube >= shape.diameter:
        sentence = (
            f"the tube of the torus, {shape.tube:.6g} mm, must be thinner than its diameter, {shape.diameter:.6g} mm"
        )
        return (OutlineFlaw("torus-meets-itself", sentence, "make the tube thinner or the diameter larger"),)
    return ()


def count_triangles(shape: Primitive, rung: float) -> int:
    """Triangles to expect, for the budget: exact for primitives, an upper bound for outlines. No tessellation."""
    if isinstance(shape, Block | Wedge):
        return 8 if isinstance(shape, Wedge) and shape.top_length == 0.0 else 12
    if isinstance(shape, Prism | Pyramid):
        return (2 if isinstance(shape, Pyramid) and shape.top == 0.0 else 4) * (shape.sides - 1)
    if isinstance(shape, Cylinder | Cone):
        ends = [divisions(d / 2, rung) for d in (shape.diameter, _top(shape)) if d > 0.0]
        slant = math.hypot((shape.diameter - _top(shape)) / 2, shape.length)
        extra = 2 * max(ends) if len(set(ends)) == 2 and fan_share(slant, rung) < 0.5 else 0
        return sum(2 * n - 2 for n in ends) + extra
    if isinstance(shape, Sphere | Ellipsoid):
        n = divisions((max(shape.axes) if isinstance(shape, Ellipsoid) else shape.diameter) / 2, rung)
        return n * (n - 2)
    if isinstance(shape, Torus):
        return 2 * divisions((shape.diameter + shape.tube) / 2, rung) * divisions(shape.tube / 2, rung)
    if isinstance(shape, Relief | ParametricSurface):
        return sheets.count_triangles(shape, rung)
    if isinstance(shape, Envelope):
        inside = ((each, count_triangles(_primitive(each), rung / _scale(each))) for each in shape.placed)
        return sum(len(each.placements) * n for each, n in inside)
    if isinstance(shape, Thread):
        return count_thread(shape, rung) if shape.real else count_triangles(plain(shape), rung)
    if isinstance(shape, ALONG):
        return count_along(shape, rung)
    if isinstance(shape, Edged):
        return 0 if edge_flaws(shape) else count_edged(shape, rung)
    if isinstance(shape, Extrude) and (shape.taper or shape.twist):
        return 0 if problems_of(shape) else stack.count_triangles(shape, None, rung)
    loops = [oriented(loop, k == 0) for k, loop in enumerate((shape.outline.outer, *shape.outline.holes))]
    chords = sum(count_chords(curves, rung) for curves in loops)
    if isinstance(shape, Extrude):
        return 4 * chords
    # A sloping line may take a second ring (`revolve`).
    lines = sum(not (curve.radius or curve.is_free) for curves in loops for curve in curves)
    return 2 * (chords + lines) * divisions(max(extent(loops[0])[1][0], rung), rung)


def _primitive(placed: Placed) -> Primitive:
    if isinstance(placed.shape, Recipe):
        raise SolidError("a part in an envelope")
    return placed.shape


def _scale(placed: Placed) -> float:
    return max((largest_scale(placement) for placement in placed.placements), default=1.0)


def _moved(placed: Placed, made: Shell) -> F64:
    """Vertices of all copies of one shape in an envelope, (n,3)."""
    vertices = made.vertices - (0.0, 0.0, rise(_primitive(placed)) / 2 if placed.centred else 0.0)
    return np.concatenate([apply(placement, vertices) for placement in placed.placements])


def rise(shape: Primitive) -> float:
    """The length of a shape that stands on z = 0; 0 for those that are centred or revolved."""
    if isinstance(shape, Edged):
        return rise(shape.shape)
    if isinstance(shape, Block | Wedge):
        return shape.size[2]
    if isinstance(shape, Cylinder | Cone | Prism | Pyramid | Extrude | Thread | Spring | Bellows | Transition):
        return shape.length
    return 0.0


def require_positive(shape: Primitive) -> None:
    """SolidError unless every size is a positive finite number; `top` and `top_length` may be 0."""
    may_be_zero, any_sign = {"top", "top_length", "bore"}, {"taper", "twist", "u", "v"}
    for name in type(shape).__struct_fields__:
        value = getattr(shape, name)
        for each in value if isinstance(value, tuple) else (value,):
            if (
                isinstance(each, int | float)
                and not isinstance(each, bool)
                and not (
                    math.isfinite(each) and (each > 0.0 or (each == 0.0 and name in may_be_zero) or name in any_sign)
                )
            ):
                raise SolidError(f"{type(shape).__name__}: {name} is {each}")


def _top(shape: Cylinder | Cone) -> float:
    return shape.top if isinstance(shape, Cone) else shape.diameter


def _ellipsoid(shape: Ellipsoid, rung: float) -> Shell:
    widest = max(shape.axes)
    ball = revolve(_profile(Sphere(widest), rung), rung)
    x, y, z = (axis / widest for axis in shape.axes)
    affine = np.array([[x, 0.0, 0.0, 0.0], [0.0, y, 0.0, 0.0], [0.0, 0.0, z, 0.0]])
    return Shell(ball.vertices * (x, y, z), ball.faces, ball.face_surface, place(ball.surfaces, affine))


def _profile(shape: Cylinder | Cone | Sphere | Torus | Revolve, rung: float) -> list[Polyline]:
    if isinstance(shape, Revolve):
        return flatten(shape.outline, rung)
    if isinstance(shape, Sphere):
        r = shape.diameter / 2
        arc = Curve((0.0, -r), (0.0, r), (0.0, 0.0), r)
        return [polyline((arc, Curve((0.0, r), (0.0, -r))), rung)]
    if isinstance(shape, Torus):
        r, far = shape.tube / 2, (shape.diameter + shape.tube) / 2
        return [polyline((Curve((far, 0.0), (far, 0.0), (shape.diameter / 2, 0.0), r),), rung)]
    r, top = shape.diameter / 2, _top(shape) / 2
    corners: list[Point2] = [(0.0, 0.0), (r, 0.0), (top, shape.length), (0.0, shape.length)]
    if top == 0.0:
        corners.pop()
    curves = tuple(Curve(a, b) for a, b in zip(corners, corners[1:] + corners[:1], strict=True))
    return [polyline(curves, rung)]
