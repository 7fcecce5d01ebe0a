"""The platewright language: text to tree and back. No numpy, no files, no meaning."""
