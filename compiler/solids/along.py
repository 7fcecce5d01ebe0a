"""The shapes that run along a path or between outlines, behind one door: shell, flaws, triangles, points of the box."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from .flaw import SolidError
from .ladder import divisions
from .outline import OutlineFlaw, count_chords, extent, flatten, oriented
from .recipe import Bellows, Cone, Cylinder, Outline, Point2, Spring, Sweep, Transition, Tube
from .revolve import count_triangles as count_revolved
from .revolve import revolve
from .selfcut import flaws_along
from .shell import Shell
from .spine import PathFlaw, length_of
from .stations import affordable, parameters, stations
from .surfaces import place
from .sweep import bellows_outline, parts_of, reach_from_path, rings, swept
from .transition import as_cone, transition, transition_flaws

F64 = NDArray[np.float64]

ALONG = (Sweep, Tube, Spring, Bellows, Transition)
Along = Sweep | Tube | Spring | Bellows | Transition
_BOX = 2e-3
_MOST_POINTS = 500_000


def along_shell(shape: Along, rung: float) -> Shell:
    """The closed shell at a chord error. SolidError for what `along_flaws` would have refused."""
    if isinstance(shape, Transition):
        return transition(shape, rung)
    if not isinstance(shape, Bellows):
        return swept(shape, rung)
    outline = bellows_outline(shape)
    if outline is None:
        raise SolidError(f"a bellows that cannot be folded: {shape}")
    return revolve(flatten(outline, rung), rung)


def along_flaws(shape: Along) -> tuple[OutlineFlaw, ...]:
    """What is wrong with a shape, whatever the rung: of its outlines, its path, and where it would cut itself."""
    return transition_flaws(shape) if isinstance(shape, Transition) else flaws_along(shape)


def count_along(shape: Along, rung: float) -> int:
    """Triangles at most; 0 for a path or a fold that is a mistake."""
    if isinstance(shape, Transition):
        return 2 * (_chords(shape.lower, rung) + _chords(shape.upper, rung))
    if isinstance(shape, Bellows):
        outline = bellows_outline(shape)
        return count_revolved(flatten(outline, rung), rung) if outline is not None else 0
    outline, found, twist = parts_of(shape)
    if isinstance(found, PathFlaw):
        return 0
    reach = _reach(outline)
    total = sum(map(length_of, found.stretches))
    turned = math.radians(abs(twist)) + (math.pi if found.is_closed else 0.0)
    n = sum(len(parameters(s, rung, reach, turned * length_of(s) / total)) for s in found.stretches)
    k = _chords(outline, rung)
    if isinstance(shape, Sweep) and turned:
        # The chords of a twisted section are short: `sweep.body` divides them.
        k += math.ceil(_perimeter(outline, rung) * math.tau / (4.0 * rung * divisions(reach, rung)))
    return 2 * k * n + 4 * k


def box_points(shape: Sweep | Tube | Transition) -> F64:
    """Points (k,3) whose box is that of the shape, to 1/500 of the section's reach where that takes at most
    half a million points; one point for a mistake."""
    if isinstance(shape, Transition):
        return np.concatenate((_corners(shape.lower, 0.0), _corners(shape.upper, shape.length)))
    outline, found, twist = parts_of(shape)
    if isinstance(found, PathFlaw):
        return np.zeros((1, 3))
    reach = _reach(outline)
    outer = Outline(outline.outer)
    rung = affordable(found, _BOX * reach, reach, lambda at: _chords(outer, at), _MOST_POINTS)
    loops = flatten(outer, rung)
    points: F64 = rings(loops, stations(found, rung, reach_from_path(loops), twist)).reshape(-1, 3)
    return points


def placed_cone(shape: Transition) -> tuple[Cone | Cylinder, Point2] | None:
    """The cone or cylinder that a transition between circles of one axis is, and where it stands."""
    found = as_cone(shape)
    if found is None:
        return None
    cone, centre = found
    return (Cylinder(cone.diameter, cone.length) if cone.diameter == cone.top else cone), centre


def shifted(inner: Shell, by: Point2) -> Shell:
    """A shell moved in its plane."""
    affine = np.column_stack((np.eye(3), (*by, 0.0)))
    return Shell(inner.vertices + np.array((*by, 0.0)), inner.faces, inner.face_surface, place(inner.surfaces, affine))


def _chords(outline: Outline, rung: float) -> int:
    loops = [oriented(loop, k == 0) for k, loop in enumerate((outline.outer, *outline.holes))]
    return sum(count_chords(curves, rung) for curves in loops)


def _perimeter(outline: Outline, rung: float) -> float:
    chords = (np.roll(loop.points, -1, axis=0) - loop.points for loop in flatten(outline, rung))
    return sum(float(np.hypot(*each.T).sum()) for each in chords)


def _reach(outline: Outline) -> float:
    (x0, y0), (x1, y1) = extent(oriented(outline.outer, True))
    return math.hypot(max(-x0, x1), max(-y0, y1))


def _corners(outline: Outline, z: float) -> F64:
    (x0, y0), (x1, y1) = extent(oriented(outline.outer, True))
    return np.array([(x0, y0, z), (x1, y0, z), (x1, y1, z), (x0, y1, z)])
