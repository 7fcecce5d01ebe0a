"""One panel as lines: what is seen of it, joined, weighted and grouped, with the areas that it encloses."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..contract import F64, I32, FaceOrigin, Geometry, LineClass, Page, Panel
from .clipping import clipped, near
from .contours import contours_of
from .conventions import conventions_of, curves_of
from .edges import edges_of
from .model import Candidates, Pieces, Region, View, joined
from .occluders import Occluders, occluders_of
from .penetrations import penetrations_of
from .regions import regions_of
from .segments import candidates as drawn
from .topology import Topology
from .view import see_view
from .visibility import cut

_CLIP_MARGIN_MM = 0.5


@dataclass(frozen=True, eq=False, slots=True)
class Seen:
    """A panel's geometry as seen: the view, every line that may be drawn, what is seen of each, and the areas."""

    view: View
    candidates: Candidates
    pieces: Pieces
    occluders: Occluders
    regions: tuple[Region, ...]


def see(
    geometry: Geometry,
    panel: Panel,
    page: Page,
    threads: int | None = None,
    topology: Topology | None = None,
    with_regions: bool = True,
) -> Seen:
    """Find every line of a panel and what is seen of it. The result does not depend on `threads`.

    Cost: linear in triangles, and in lines times the logarithm of triangles; `regions` near linear in what is seen.
    """
    view = see_view(geometry, panel, page, topology, threads)
    occluders = occluders_of(view, threads)
    candidates = joined(
        (
            edges_of(view, panel.style, threads),
            contours_of(view),
            _owned(penetrations_of(view, threads), view, occluders.rank),
            conventions_of(view, panel.style, occluders),
            curves_of(view, panel.curves),
        )
    )
    if panel.clip is not None:
        candidates = near(candidates, panel.clip, _CLIP_MARGIN_MM)
    pieces = cut(view, candidates, threads, occluders=occluders)
    if panel.clip is not None:
        candidates, pieces = _closed_by(panel.clip, candidates, pieces)
    regions = regions_of(view, pieces, candidates, occluders) if with_regions else ()
    if panel.clip is not None:
        pieces = clipped(pieces, panel.clip)
    return Seen(view, _sectioned(candidates, view), pieces, occluders, regions)


def _owned(penetrations: Candidates, view: View, rank: I32) -> Candidates:
    """Lines of penetration as those of the part whose path sorts first, in whatever order the two are declared."""
    if not len(penetrations):
        return penetrations
    nodes = view.face_node[penetrations.faces]
    first = rank[nodes[:, 0]] <= rank[nodes[:, 1]]
    return replace(penetrations, node=np.where(first, nodes[:, 0], nodes[:, 1]).astype(np.int32))


def _closed_by(polygon: F64, candidates: Candidates, pieces: Pieces) -> tuple[Candidates, Pieces]:
    """Lines with the sides of a polygon among them, which are not drawn but close the areas that it cuts."""
    n, following = len(polygon), np.roll(polygon, -1, axis=0)
    start, end = (np.column_stack((points, np.zeros(n))) for points in (polygon, following))
    sides = replace(drawn(start, end, LineClass.VISIBLE_EDGE), is_drawn=np.zeros(n, np.bool_))
    rows = np.arange(len(candidates), len(candidates) + n, dtype=np.int32)
    more = Pieces(
        np.concatenate((pieces.segment, rows)),
        np.concatenate((pieces.span, np.tile((0.0, 1.0), (n, 1)))),
        np.concatenate((pieces.is_visible, np.ones(n, np.bool_))),
        np.concatenate((pieces.start, start)),
        np.concatenate((pieces.end, end)),
    )
    return joined((candidates, sides)), more


def _sectioned(candidates: Candidates, view: View) -> Candidates:
    """No line stands where a cut face is seen edge-on: there the halves of a half section meet (ISO 128-3)."""
    origin = view.geometry.face_origin[view.face_row]
    if not len(candidates) or not origin.any():
        return candidates
    has_face = candidates.faces >= 0
    is_cap = has_face & (origin[candidates.faces] == FaceOrigin.SECTION_CAP)
    edge_on = is_cap & (view.facing[candidates.faces] == 0)
    return replace(candidates, is_drawn=candidates.is_drawn & ~edge_on.any(axis=1))
