"""From tree to scene graph, world-space triangles and figure jobs."""
