"""The page on this machine alone, made again whenever the inputs change.

The work is done in the thread that calls, since drawing wants the main one; answers are given by threads that only read what was made last.
"""

from __future__ import annotations

import errno
import os
import secrets
import threading
import time
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import partial
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from itertools import count
from pathlib import Path

from structviz.analysis import Analysis
from structviz.errors import ArgumentError, StructvizError
from structviz.report.html import live_script, notice_page, page_text

ADDRESS = "127.0.0.1"
EVERY_S = 0.5  # between two looks at the inputs
SETTLED = 2  # looks at which nothing changes any more before a file counts as written
MOST_FILES = 5000  # of a folder that are looked at

Make = Callable[[], Analysis]
Draw = Callable[[Analysis], dict[str, bytes]]
Stamp = tuple[tuple[str, int, int], ...]  # path, time of change, size


@dataclass
class Shown:
    """What is being shown; replaced whole."""

    version: str
    page: bytes


def inputs_of(path: Path, analysis: Analysis | None) -> list[Path]:
    """Return the files to look at: those the last analysis read, and whatever lies beside them."""
    folder = path if path.is_dir() else path.parent
    read = [folder / each.path for each in analysis.model.inputs] if analysis else []
    beside = {place.parent for place in read} | {folder}
    found = {path, *read, *(entry for place in sorted(beside) for entry in _files_in(place))}
    return sorted(found)[:MOST_FILES]


def _files_in(folder: Path) -> list[Path]:
    try:
        return [Path(entry.path) for entry in os.scandir(folder) if entry.is_file() and not entry.name.startswith(".")]
    except OSError:
        return []


def stamp_of(files: Iterable[Path]) -> Stamp:
    """Return time of change and size of files; those that are not there are left out, so that their coming and going counts."""
    found = []
    for file in files:
        try:
            state = file.stat()
        except OSError:
            continue
        found.append((str(file), state.st_mtime_ns, state.st_size))
    return tuple(found)


@contextmanager
def server_on(port: int, shown: Callable[[], Shown]) -> Iterator[int]:
    """Serve what `shown` gives, on this machine alone, until left; give the port. ArgumentError where the port cannot be had."""
    try:
        server = ThreadingHTTPServer((ADDRESS, port), _handler(shown))
    except (OSError, OverflowError) as error:
        busy = getattr(error, "errno", None) == errno.EADDRINUSE
        why = "it is in use by another program" if busy else (getattr(error, "strerror", None) or str(error))
        raise ArgumentError(f"--port {port}: cannot be served on ({why})", hint="name another, or --port 0 for any that is free") from None
    server.daemon_threads = True
    worker = threading.Thread(target=server.serve_forever, kwargs={"poll_interval": 0.1}, daemon=True)
    worker.start()
    try:
        yield server.server_address[1]
    finally:
        server.shutdown()
        server.server_close()
        worker.join()


def _handler(shown: Callable[[], Shown]) -> type[BaseHTTPRequestHandler]:
    class Handler(BaseHTTPRequestHandler):
        """Gives the page and its version to a browser on this machine; names of other hosts are refused, whatever they resolve to."""

        server_version, sys_version = "structviz", ""

        def do_GET(self) -> None:
            now, where = shown(), self.path.partition("?")[0]
            name, _, port = self.headers.get("Host", "").rpartition(":")
            if name not in (ADDRESS, "localhost") or port != str(self.connection.getsockname()[1]):
                self._give(403, "text/plain", b"this page is for this machine alone\n")
            elif where == "/":
                self._give(200, "text/html", now.page)
            elif where == "/version":
                self._give(200, "text/plain", now.version.encode())
            else:
                self._give(404, "text/plain", b"there is one page here: /\n")

        do_HEAD = do_GET

        def _give(self, code: int, kind: str, content: bytes) -> None:
            self.send_response(code)
            self.send_header("Content-Type", f"{kind}; charset=utf-8")
            self.send_header("Content-Length", str(len(content)))
            for name, value in (("Cache-Control", "no-store"), ("X-Content-Type-Options", "nosniff"), ("X-Frame-Options", "DENY")):
                self.send_header(name, value)
            self.end_headers()
            if self.command != "HEAD":
                self.wfile.write(content)

        def log_message(self, format: str, *args: object) -> None:
            """Keep quiet: the terminal tells of runs."""

    return Handler


def serve(path: Path, make: Make, *, port: int, say: Callable[[str], None], draw: Draw = lambda analysis: {}) -> None:
    """Show the page of a model on this machine and keep it up to date, until interrupted.

    `make` reads and analyses the model; `draw` gives pictures by name. A model that cannot be used shows why and goes on being watched.
    """
    session = secrets.token_hex(4)
    shown = Shown(f"{session}-0", _notice("Working", "The model is being read for the first time.", f"{session}-0"))
    analysis: Analysis | None = None
    with server_on(port, lambda: shown) as found:
        say(f"http://{ADDRESS}:{found}/  (Ctrl-C stops)")
        for run in count(1):
            files = inputs_of(path, analysis)
            before, began = stamp_of(files), time.monotonic()
            new, page, told = _made(make, draw, f"{session}-{run}")
            shown, analysis = Shown(f"{session}-{run}", page), new or analysis
            say(f"run {run}, {time.monotonic() - began:.1f} s: {told}")
            _wait_for_change(partial(inputs_of, path, analysis), files, before)


def _made(make: Make, draw: Draw, version: str) -> tuple[Analysis | None, bytes, str]:
    """Return an analysis with its page and a line on it; where it fails, None with a page that says why."""
    try:
        analysis = make()
        page = page_text(analysis, pictures=draw(analysis), live=live_script(version))
        return analysis, _encoded(page), f"{len(analysis.conflicting):,} of {len(analysis.faults):,} faults in conflict"
    except StructvizError as error:
        return None, _notice("This model cannot be used", str(error), version), str(error)
    except Exception as error:  # a fault of ours must not end the watch over somebody's work
        told = f"this is a fault of structviz, not of the input: {type(error).__name__}: {error}"
        return None, _notice("This model could not be worked on", told, version), told


def _wait_for_change(files: Callable[[], list[Path]], earlier: list[Path], before: Stamp) -> None:
    """Return once files differ from what they were before the run, and have come to rest.

    Those looked at before the run are compared first, so that a change made during it is not missed.
    """
    if stamp_of(earlier) == before:
        before = stamp_of(files())
        while stamp_of(files()) == before:
            time.sleep(EVERY_S)
    last, quiet = stamp_of(files()), 0
    while quiet < SETTLED:
        time.sleep(EVERY_S / 2)
        now = stamp_of(files())
        last, quiet = now, (quiet + 1 if now == last else 0)


def _notice(title: str, text: str, version: str) -> bytes:
    return _encoded(notice_page(title, text, live=live_script(version)))


def _encoded(text: str) -> bytes:
    return text.encode("utf-8", "backslashreplace")
