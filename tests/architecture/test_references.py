"""Every source cited is in the table, and every source in the table is cited."""

from __future__ import annotations

import re
from pathlib import Path

from structviz.references import REFERENCES

CITATION = re.compile(r"\[([a-z]+(?:19|20)\d\d[a-z]?)\]")
SOURCE = re.compile(r'source="([a-z]+(?:19|20)\d\d[a-z]?)"')


def cited(project: Path) -> dict[str, list[str]]:
    """Return key -> where it is cited."""
    places: dict[str, list[str]] = {}
    for file in sorted((project / "structviz").rglob("*.py")):
        if file.name == "references.py":
            continue
        for number, line in enumerate(file.read_text(encoding="utf-8").splitlines(), 1):
            for key in CITATION.findall(line) + SOURCE.findall(line):
                places.setdefault(key, []).append(f"{file.relative_to(project)}:{number}")
    return places


def test_every_citation_has_its_source(project: Path) -> None:
    missing = {key: places[0] for key, places in cited(project).items() if key not in REFERENCES}
    assert not missing, f"add to references.py: {missing}"


def test_every_source_is_cited(project: Path) -> None:
    assert not set(REFERENCES) - set(cited(project)), "cite it where it is used, or drop it"


def test_keys_match_their_citations() -> None:
    for key, text in REFERENCES.items():
        found = re.fullmatch(r"([a-z]+)(\d{4})[a-z]?", key)
        assert found, key
        name, year = found.groups()
        assert name in re.sub(r"[^a-z]", "", text.split("(")[0].lower()), key
        assert f"({year})" in text, key
