"""Writers: each returns bytes."""
