"""Command line, sessions and files: the only floor that touches disk, terminal and process."""
