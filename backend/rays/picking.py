"""What stands at a point of the page, without drawing the page."""

from __future__ import annotations

import numpy as np

from .. import camera
from ..contract import F64, Projection
from .bvh import Tree
from .tracing import Hits, nearest


def pick(tree: Tree, projection: Projection, page_points: F64) -> Hits:
    """The foremost face at each of the page points (n,2), float64 mm.

    Distances are mm along the unit line of sight: from the eye, or in parallel projection from where depth is 0, and
    then negative before it.
    """
    origins, directions = camera.rays(projection, page_points)
    if projection.eye is not None:
        return nearest(tree, origins, directions)
    back = np.einsum("nk,nk->n", tree.centre - origins, directions) - 2.0 * tree.radius
    hits = nearest(tree, origins + back[:, None] * directions, directions)
    return Hits(hits.face, hits.distance + back, hits.barycentric)
