"""A visit to a page with the network off: what it asked for and what it complained of."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any


@dataclass
class Visit:
    """One page that is open, with every request it made beyond itself and every line on its console."""

    page: Any
    requests: list[str] = field(default_factory=list)
    complaints: list[str] = field(default_factory=list)


@contextmanager
def visiting(browser: Any, file: Path, **choices: Any) -> Iterator[Visit]:
    """Open a file in a browser, offline, and give the visit."""
    context = browser.new_context(offline=True, reduced_motion="reduce", **choices)
    visit = Visit(context.new_page())
    address = file.as_uri()
    inside = ("data:", "blob:", address)
    visit.page.on("request", lambda request: None if request.url.startswith(inside) else visit.requests.append(request.url))
    visit.page.on("console", lambda message: visit.complaints.append(message.text))
    visit.page.on("pageerror", lambda error: visit.complaints.append(str(error)))
    visit.page.goto(address)
    try:
        yield visit
    finally:
        context.close()
