"""Reference cases: values from outside the project, each with its source and how far that source can be trusted.

A test named `test_wb_01_...` gets case WB-01 as its argument `case`; its id shows the status of the value, and every failure shows
the source too.
"""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

TABLE = Path(__file__).with_name("cases.json")


@dataclass(frozen=True)
class Case:
    """One reference case."""

    id: str
    title: str
    input: Any
    expected: Any
    tolerance: str
    source: str
    status: str

    @property
    def about(self) -> str:
        return f"\n{self.id} {self.title}\n  source: {self.source}\n  status: {self.status}\n  tolerance: {self.tolerance}"

    def near(self, found: Any, wanted: Any, atol: float, period: float = 0.0) -> None:
        """Assert that numbers agree within atol, around the circle where a period is given."""
        found, wanted = np.asarray(found, float), np.asarray(wanted, float)
        assert found.shape == wanted.shape, f"{found.shape} against {wanted.shape}{self.about}"
        if period:
            found = wanted + (found - wanted + period / 2) % period - period / 2
        np.testing.assert_allclose(found, wanted, rtol=0, atol=atol, err_msg=self.about)

    def same(self, found: Any, wanted: Any) -> None:
        """Assert equality."""
        assert found == wanted, f"{found!r} against {wanted!r}{self.about}"


def load_cases() -> dict[str, Case]:
    """Return the cases by id."""
    names = Case.__dataclass_fields__
    rows = json.loads(TABLE.read_text(encoding="utf-8"))["cases"]
    return {row["id"]: Case(**{name: row[name] for name in names}) for row in rows}


def pytest_generate_tests(metafunc: pytest.Metafunc) -> None:
    """Hand each test the case its name begins with."""
    if "case" in metafunc.fixturenames:
        found = re.match(r"test_([a-z]+)_(\d+)", metafunc.function.__name__)
        assert found, f"{metafunc.function.__name__} does not begin with the id of a case"
        case = load_cases()[f"{found[1].upper()}-{found[2]}"]
        metafunc.parametrize("case", [case], ids=[f"{case.id}, {case.status}"])


@pytest.fixture(scope="session")
def cases() -> dict[str, Case]:
    """Return all cases by id."""
    return load_cases()
