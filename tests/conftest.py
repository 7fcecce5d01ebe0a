"""One option of our own for pytest."""

import pytest


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--update", action="store_true", help="rewrite the expected outputs of tests/cases")
