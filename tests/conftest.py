"""What all tests share: one engine for the whole session."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from tauledger.engine.client import Engine, start_engine


@pytest.fixture(scope="session")
def engine() -> Iterator[Engine]:
    """The engine, started once; every test loads circuits of its own into it."""
    with start_engine(timeout_s=30.0) as started:
        yield started


def pytest_addoption(parser: pytest.Parser) -> None:
    """--write-tables: print the tables that DEVELOPERS.md keeps."""
    parser.addoption("--write-tables", action="store_true", help="print the tables that DEVELOPERS.md keeps")
