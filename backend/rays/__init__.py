"""Rays: a hierarchy over triangles, what rays meet, and how much of a light or the sky points see.

`build_over` makes the hierarchy of a geometry; `nearest` and `is_stopped` ask single rays, `light_seen` and `sky_seen`
points with normals, `picking.pick` points of the page. numba comes with every one of these modules, so name them
only when something is drawn.
"""
