"""Options of the whole suite."""

import pytest
from hypothesis import settings

# The same examples on every machine and in every order of tests; new ones come with a new version of the library.
settings.register_profile("steady", max_examples=60, deadline=None, derandomize=True)
settings.load_profile("steady")


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--picture", action="store_true", help="take the README's picture of the bench anew")
