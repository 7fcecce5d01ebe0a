"""Type: the outlines and widths of letters, from fonts that come as packages."""
