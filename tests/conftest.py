"""What tests share: where the open data lie, and what may be skipped."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

PROJECT = Path(__file__).resolve().parents[1]
SHARED = PROJECT.parent / "shared"


def skip_or_fail(reason: str, wanted_under: tuple[str, ...] = ("all", "all-but-data")) -> None:
    """Skip with the reason; under a STRUCTVIZ_TESTS that wants it fail instead, so that the project's own check misses nothing."""
    chosen = os.environ.get("STRUCTVIZ_TESTS")
    if chosen in wanted_under:
        pytest.fail(f"STRUCTVIZ_TESTS={chosen}, but {reason}")
    pytest.skip(reason)


@pytest.fixture(scope="session")
def project() -> Path:
    """Return the folder of the project."""
    return PROJECT


@pytest.fixture(scope="session")
def shared_data() -> Path:
    """Return the folder of open data that lies beside the project, or skip.

    STRUCTVIZ_TESTS=all-but-data is for a checkout alone on its machine: what it can have must be there, the data may not.
    """
    folder = SHARED / "data"
    if not folder.is_dir():
        skip_or_fail("the open data folder shared/data is not beside the project", wanted_under=("all",))
    return folder
