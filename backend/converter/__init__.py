"""From a drawing to pixels: strokes, fills and glyphs with exact coverage, in bands."""
