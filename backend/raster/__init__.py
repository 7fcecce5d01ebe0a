"""The visibility-buffer rasteriser and its shading."""
