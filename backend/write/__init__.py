"""Writers: each is a pure function that returns the bytes of one file."""
