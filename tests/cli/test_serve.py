"""`structviz serve` as users meet it: the page follows the files, a broken file shows why, Ctrl-C ends it."""

from __future__ import annotations

import os
import re
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path
from urllib.request import urlopen

import pytest

from structviz.cli.main import entry

QUICK = ("--replicates", "60", "--stations", "8")


def awaited(url: str, wanted: str, seconds: float = 60.0) -> str:
    """Return the page once it holds what is wanted."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        page = urlopen(url, timeout=10).read().decode("utf-8")
        if wanted in page:
            return page
        time.sleep(0.1)
    raise AssertionError(f"never saw {wanted!r}")


@pytest.mark.skipif(os.name == "nt", reason="signals of this kind do not exist there")
def test_the_page_follows_the_files(wrong: Path, tmp_path: Path, project: Path) -> None:
    model = tmp_path / "model"
    shutil.copytree(wrong, model)
    command = [sys.executable, "-m", "structviz", "serve", str(model), "--port", "0", *QUICK]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=project) as process:
        try:
            assert process.stdout is not None
            url = re.match(r"http://127\.0\.0\.1:\d+/", process.stdout.readline())
            assert url is not None
            assert "2 of 14 faults conflict" in awaited(url[0], "faults conflict")
            table = (model / "faults.csv").read_text("utf-8")
            (model / "faults.csv").write_text(table + "broken,,,\n", "utf-8")
            assert "found no surface" in awaited(url[0], "This model cannot be used")
            (model / "faults.csv").write_text(table, "utf-8")
            awaited(url[0], "2 of 14 faults conflict")
        finally:
            process.send_signal(signal.SIGINT)
            said, wrong_said = process.communicate(timeout=30)
    assert process.returncode == 0
    assert said.endswith("stopped\n")
    assert wrong_said == ""


@pytest.mark.parametrize("port", ["-1", "65536", "x"])
def test_a_port_out_of_range_is_told(sound: Path, port: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert entry(["serve", str(sound), f"--port={port}"]) == 2
    assert f"--port: found {port if port != 'x' else repr(port)}" in capsys.readouterr().err
