"""Spectra: sources of light, surfaces and the air between them, and what the CIE 1931 observer sees of both."""
