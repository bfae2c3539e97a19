"""Reads damaged inputs one after the other in a process with limits, and tells what came of each on standard output.

Called with a folder of cases; each case is a folder of files and a line of JSON on standard input names the one to read.
The line `begin N` is printed before a case, so that whoever started this knows which one ended the process.
"""

from __future__ import annotations

import json
import os
import resource
import signal
import sys
import tempfile
import time
import warnings
from pathlib import Path

SECONDS = 10
CHANGES = {
    "os.remove",
    "os.rename",
    "os.mkdir",
    "os.rmdir",
    "os.symlink",
    "shutil.rmtree",
    "subprocess.Popen",
    "os.system",
    "socket.connect",
}
EXTRA_BYTES, TIMES = 500 << 20, 10  # memory: ten times the files and 500 MB on top of what the libraries take


def main() -> None:
    """Read each case named on standard input."""
    from structviz.errors import StructvizError
    from structviz.inspection import inspect
    from structviz.io import read_model

    touched: list[str] = []
    allowed = os.path.realpath(tempfile.gettempdir())
    sys.addaudithook(lambda event, args: _note(touched, allowed, event, args))
    warnings.simplefilter("ignore")
    signal.signal(signal.SIGALRM, _too_long)
    _warm_up()
    for line in sys.stdin:
        case = json.loads(line)
        print(f"begin {case['number']}", flush=True)
        _limit_memory(case["bytes"])
        touched.clear()
        began = time.perf_counter()
        signal.alarm(SECONDS)
        try:
            inspect(read_model(Path(case["path"])))
            outcome = "read"
        except StructvizError as error:
            outcome = f"refused: {type(error).__name__}" if error.hint and str(error).strip() else f"FAULT: no hint: {error}"
        except TimeoutError:
            outcome = f"FAULT: longer than {SECONDS} s"
        except BaseException as error:  # whatever comes is the finding
            outcome = f"FAULT: {type(error).__name__}: {error}"[:300]
        signal.alarm(0)
        if touched:
            outcome = f"FAULT: wrote {touched[0]}"
        print(json.dumps({"number": case["number"], "outcome": outcome, "seconds": round(time.perf_counter() - began, 3)}), flush=True)


def _warm_up() -> None:
    """Load what readers load when first used, before memory is limited."""
    from tests_fuzz_samples import samples  # put on the path by whoever starts this

    from structviz.inspection import inspect
    from structviz.io import read_model

    with tempfile.TemporaryDirectory() as folder:
        for kind, files in samples().items():
            place = Path(folder, kind.replace(" ", "_"))
            place.mkdir()
            for name, content in files.items():
                (place / name).write_bytes(content)
            first = next(iter(files))
            inspect(read_model(place / ("model.toml" if "model.toml" in files else first)))


def _limit_memory(size: int) -> None:
    with open("/proc/self/statm", encoding="ascii") as file:
        held = int(file.read().split()[0]) * os.sysconf("SC_PAGE_SIZE")
    most = held + EXTRA_BYTES + TIMES * size
    resource.setrlimit(resource.RLIMIT_AS, (most, resource.getrlimit(resource.RLIMIT_AS)[1]))


def _too_long(number: int, frame: object) -> None:
    raise TimeoutError


def _note(touched: list[str], allowed: str, event: str, args: tuple) -> None:
    """Note what is opened for writing, removed, renamed or made outside the place for temporary files."""
    if event == "open" and isinstance(args[0], (str, bytes)) and isinstance(args[1], str) and any(letter in args[1] for letter in "wax+"):
        path = os.path.realpath(os.fsdecode(args[0]))
        if not path.startswith((allowed, "/dev/null")):
            touched.append(path)
    elif event in CHANGES:
        touched.append(f"{event} {args[:2]}")


if __name__ == "__main__":
    main()
