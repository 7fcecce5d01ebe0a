"""What goes with a view on its panel: title, section, cutting-plane lines, frames of details, links, clipping."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import structs
from platewright.backend import camera, contract
from platewright.backend.contract import F64

from .explosion import Explosion
from .frames import Frame, content
from .graph import Point
from .mistakes import mistake
from .sections import EDGE_ON, Cut, away_of, letter_of, trace_of
from .specs import Spec
from .views import View

TRACE_PAST_MM = 6.0
"""How far on paper a cutting-plane line runs past what it cuts."""

_N_CLIP = 96


def carried(spec: Spec, explosion: Explosion) -> Spec:
    """A figure whose details and views by arrow look where the marks they name have been moved to."""

    def place(holder: str) -> str:
        return f"{spec.path}.{holder}" if holder else spec.path

    details = tuple(
        structs.replace(each, centre=explosion.carry(each.centre, place(each.holder))) for each in spec.details
    )
    looks = []
    for look in spec.looks:
        window, path = look.window, place(look.holder)
        if window is not None:
            window = (explosion.carry(window[0], path), window[1])
        aim = None if look.aim is None else explosion.carry(look.aim, path)
        looks.append(structs.replace(look, window=window, aim=aim))
    return structs.replace(spec, details=details, looks=tuple(looks))


def title_height(width: float) -> float:
    """Height in mm of the letters that name views on a page of this width: one step of ISO 3098 above its letters."""
    return 3.5 if width <= 100.0 else 5.0


def title_of(
    spec: Spec, view: View, projection: contract.Projection, vertices: F64, frame: Frame
) -> contract.Inscription:
    """The name of a view, above its content; that of a detail with its scale."""
    text, window = view.title, view.window
    if window is not None:
        middle, _ = camera.to_page(projection, np.array([window.centre]))
        across, top = float(middle[0, 0]), float(middle[0, 1]) - window.diameter / 2 * projection.scale
        text += f" ({_scale_text(spec, view, frame)})" if window.letter else ""
    else:
        low, high, _ = content(projection, vertices)
        across, top = (low[0] + high[0]) / 2, low[1]
    height = title_height(frame.width)
    return contract.Inscription(text, (across, top - height * 0.8), height)


def _scale_text(spec: Spec, view: View, frame: Frame) -> str:
    """A scale as ISO 5455 writes it where the figure states one, else how many times the view is enlarged."""
    if spec.scale is None:
        return f"{view.factor:g}×"
    scale = frame.scale * view.factor
    return f"{scale:.4g}:1" if scale >= 1 else f"1:{1 / scale:.4g}"


def section_of(
    spec: Spec, view: View, projection: contract.Projection, uncut: tuple[int, ...]
) -> contract.Section | None:
    """What is said of a view's first section, `uncut` being rows of nodes left whole.

    Raises Mistake where it is seen edge-on.
    """
    if not view.cuts:
        return None
    cut = spec.cuts[view.cuts[0]]
    letter = "" if view.shows == "revolved" else letter_of(view.cuts[0])
    return contract.Section(cut.plane.through, away_of(cut, projection.sight), uncut, letter, view.shows)


def faces_alone(geometry: contract.Geometry, points: F64) -> F64:
    """Those of the vertices' points (n,3) that cut faces have."""
    is_cut = geometry.face_origin == contract.FaceOrigin.SECTION_CAP
    found: F64 = points[np.unique(geometry.faces[is_cut])]
    return found


def turned_into(projection: contract.Projection, cut: Cut, points: F64 | None = None) -> contract.Projection:
    """The view of a cut face turned into the picture plane of a view that sees it edge-on, about its own middle.

    `points` (n,3) are those of the cut face; without them it turns about the plane's point. Raises Mistake where the
    plane is not seen edge-on.
    """
    normal, sight = np.array(cut.plane.normal), np.array(projection.sight)
    if projection.kind != "parallel" or abs(float((normal * sight).sum())) > EDGE_ON:
        sentence = (
            "a revolved section is turned into the plane of a view that sees it edge-on, and the main view does not"
        )
        raise mistake("edge-on-section", cut.span, sentence, "take another view, or a `removed section`")
    along = np.cross(sight, normal)
    middle = np.array(cut.plane.through)
    if points is not None:
        deep = points @ sight
        middle = middle + sight * ((float(deep.min()) + float(deep.max())) / 2 - float((middle * sight).sum()))
    right, up = np.array(projection.right), np.array(projection.up)
    # What lies deeper is turned to the side that the normal points to, or that which is looked at from where it stays.
    side = 1.0
    for _ in range(2):
        turned = [
            along * float((along * axis).sum()) + side * sight * float((normal * axis).sum()) for axis in (right, up)
        ]
        seen = np.cross(turned[1], turned[0])
        if cut.keeping is None or float((seen * np.array(cut.keeping)).sum()) > 0:
            break
        side = -side
    axes = camera.Axes(_point(turned[0]), _point(turned[1]), _point(seen))
    origin, _ = camera.to_page(projection, middle[None])
    at = (float(origin[0, 0]), float(origin[0, 1]))
    return camera.parallel(axes, camera.magnification(projection), at, middle, projection.scale)


def _point(array: F64) -> Point:
    x, y, z = (float(each) + 0.0 for each in array)
    return (x, y, z)


def traces_of(
    spec: Spec, view: View, projection: contract.Projection, vertices: F64, sights: dict[int, Point]
) -> tuple[contract.CuttingPlaneLine, ...]:
    """Cutting-plane lines of the sections that other views show, looking along `sights`."""
    found: list[contract.CuttingPlaneLine] = []
    for number in view.traces:
        cut = spec.cuts[number]
        away = away_of(cut, sights[number])
        points = trace_of(cut, away, projection.sight, vertices, TRACE_PAST_MM / projection.scale)
        seen = (-away[0], -away[1], -away[2])
        found.append(contract.CuttingPlaneLine(points, seen, letter_of(number)))
    return tuple(found)


def links_of(views: Sequence[View]) -> tuple[contract.Link, ...]:
    """Which panel is the parent of which section or detail."""
    found: list[contract.Link] = []
    for child, view in enumerate(views):
        if view.window is not None and view.window.letter:
            found.append(contract.Link("detail", 0, child, view.window.letter))
            continue
        for number in view.cuts:
            parents = [row for row, other in enumerate(views) if number in other.traces]
            found += [contract.Link("section", parent, child, letter_of(number)) for parent in parents]
    return tuple(found)


def frames_of_details(views: Sequence[View], projection: contract.Projection) -> tuple[contract.DetailFrame, ...]:
    """The circles in the main view round what details show."""
    windows = [view.window for view in views if view.window is not None and view.window.letter]
    return tuple(contract.DetailFrame(each.centre, each.diameter * projection.scale, each.letter) for each in windows)


def frame_round(view: View, projection: contract.Projection) -> tuple[contract.DetailFrame, ...]:
    """The circle round a detail or local view itself, which needs no letter."""
    if view.window is None:
        return ()
    return (contract.DetailFrame(view.window.centre, view.window.diameter * projection.scale, ""),)


def clip_of(view: View, projection: contract.Projection) -> F64 | None:
    """The circle on the page that a detail is cut to, as a polygon."""
    if view.window is None:
        return None
    middle, _ = camera.to_page(projection, np.array([view.window.centre]))
    radius = view.window.diameter / 2 * projection.scale
    turn = np.radians(np.arange(_N_CLIP) * (360.0 / _N_CLIP))
    return np.asarray(middle[0] + radius * np.stack((np.cos(turn), np.sin(turn)), axis=1))


def check_shown(spec: Spec, geometry: contract.Geometry, emphasis: contract.U8 | None) -> None:
    """Raises Mistake where everything is hidden."""
    if emphasis is None:
        return
    shown = emphasis[[row for row, node in enumerate(geometry.nodes) if node.mesh >= 0]]
    if len(shown) and bool((shown == contract.Emphasis.HIDE).all()):
        span = spec.stresses[-1].span
        raise mistake("nothing-to-show", span, f"everything in `{spec.path}` is hidden", "hide less")


def measured(geometry: contract.Geometry) -> tuple[contract.MeasureWanted, ...]:
    """The subject and everything placed directly in it, in the main view."""
    return tuple(contract.MeasureWanted(0, row) for row, node in enumerate(geometry.nodes) if node.parent <= 0)
