"""Options of the whole suite."""

import pytest


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--picture", action="store_true", help="take the README's picture of the bench anew")
