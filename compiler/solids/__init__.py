"""Solids: recipes, tessellation, booleans."""
