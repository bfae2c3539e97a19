"""The page on this machine alone: who is answered, what is watched, and what a busy port says."""

from __future__ import annotations

import http.client
import os
import socket
import sys
from pathlib import Path

import pytest

from structviz.errors import ArgumentError
from structviz.report import serve as module
from structviz.report.serve import Shown, inputs_of, server_on, stamp_of


def asked(port: int, path: str, host: str = "", method: str = "GET") -> tuple[int, bytes, str]:
    connection = http.client.HTTPConnection("127.0.0.1", port, timeout=5)
    connection.request(method, path, headers={"Host": host or f"127.0.0.1:{port}"})
    answer = connection.getresponse()
    return answer.status, answer.read(), answer.headers.get("Content-Type", "")


def test_the_page_and_its_version_are_given() -> None:
    shown = Shown("v1", b"<p>one</p>")
    with server_on(0, lambda: shown) as port:
        assert asked(port, "/") == (200, b"<p>one</p>", "text/html; charset=utf-8")
        assert asked(port, "/version")[1] == b"v1"
        shown = Shown("v2", b"two")
        assert asked(port, "/version?again")[1] == b"v2"
        assert asked(port, "/", method="HEAD")[:2] == (200, b"")
        assert asked(port, "/../../etc/hostname")[0] == 404
        assert asked(port, "/", method="POST")[0] == 501


def test_other_names_for_this_machine_are_refused() -> None:
    with server_on(0, lambda: Shown("v", b"page")) as port:
        assert asked(port, "/", host=f"localhost:{port}")[0] == 200
        for host in (f"evil.example:{port}", "127.0.0.1", f"127.0.0.1:{port + 1}", "[::1]"):
            status, content, _ = asked(port, "/", host=host)
            assert (status, b"page\n" in content) == (403, False)


@pytest.mark.skipif(sys.platform != "linux", reason="other systems give only one address to the machine itself")
def test_only_this_machine_is_listened_to() -> None:
    with server_on(0, lambda: Shown("v", b"")) as port, socket.socket() as other:
        other.bind(("127.0.0.2", port))  # would be taken if every address were


def test_a_busy_port_is_told() -> None:
    with socket.socket() as other:
        other.bind(("127.0.0.1", 0))
        other.listen()
        port = other.getsockname()[1]
        with (
            pytest.raises(ArgumentError, match=f"--port {port}: cannot be served on .it is in use by another program"),
            server_on(port, lambda: Shown("v", b"")),
        ):
            pass


def test_what_is_read_and_what_lies_beside_it_is_watched(tmp_path: Path) -> None:
    (tmp_path / "model.toml").write_text("")
    (tmp_path / "a.vtp").write_text("")
    (tmp_path / ".hidden").write_text("")
    assert [path.name for path in inputs_of(tmp_path / "model.toml", None)] == ["a.vtp", "model.toml"]
    assert inputs_of(tmp_path / "gone" / "model.toml", None) == [tmp_path / "gone" / "model.toml"]


def test_a_change_of_size_time_or_presence_shows(tmp_path: Path) -> None:
    file = tmp_path / "a.vtp"
    stamps = [stamp_of([file])]
    for text in ("one", "three"):
        file.write_text(text)
        stamps.append(stamp_of([file]))
    os.utime(file, (1, 1))
    stamps.append(stamp_of([file]))
    assert len(set(stamps)) == 4


def test_a_change_made_during_the_run_is_not_missed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "EVERY_S", 0.01)
    file = tmp_path / "a.vtp"
    file.write_text("one")
    before = stamp_of([file])
    file.write_text("longer")
    module._wait_for_change(lambda: [file], [file], before)
