"""From a figure job to pictures and triangle lists. Knows no language."""
