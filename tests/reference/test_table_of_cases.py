"""Is every reference case used by a test, and does each say where it comes from?"""

from __future__ import annotations

import re
from pathlib import Path


def test_each_case_is_used_and_there_are_at_least_45(cases):
    text = "\n".join(path.read_text(encoding="utf-8") for path in Path(__file__).parent.glob("test_*.py"))
    used = {f"{topic.upper()}-{number}" for topic, number in re.findall(r"^def test_([a-z]+)_(\d+)\w*\(case", text, re.MULTILINE)}
    assert used == set(cases)
    assert len(cases) >= 45


def test_each_case_names_its_source_status_and_tolerance(cases):
    for case in cases.values():
        assert case.source, case.id
        assert case.status, case.id
        assert case.tolerance, case.id
