"""The server as a process: what it prints, how it ends, and where it cannot listen."""

from __future__ import annotations

import os
import signal
import socket
import subprocess
import sys
import urllib.error
import urllib.request
from pathlib import Path

import pytest

from archive.errors import BadRequest
from archive.web import serve


def test_a_server_with_a_token_prints_it_warns_and_ends_quietly(root: Path) -> None:
    """On another address than this machine's own it cannot be asked to do without; here it is asked for."""
    command = [
        sys.executable,
        "-c",
        "from archive.commands.main import main; main()",
        "serve",
        "--port",
        "0",
        "--token",
    ]
    with subprocess.Popen(
        [*command, "--archive", str(root)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env={**os.environ, "PYTHONUNBUFFERED": "1"},
        text=True,
    ) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        address = process.stdout.readline().split()[-1]
        assert address.startswith("http://localhost:")
        bare, _, token = address.partition("/?token=")
        assert len(token) >= 32
        with pytest.raises(urllib.error.HTTPError, match="401"):
            urllib.request.urlopen(bare + "/cooldowns")  # noqa: S310 - of this test
        opener = urllib.request.build_opener(urllib.request.HTTPCookieProcessor())
        with opener.open(address) as answer:
            assert answer.status == 200
            assert "token" not in answer.url
        process.send_signal(signal.SIGINT)
        assert process.wait(timeout=20) == 0
        said = process.stderr.read()
    assert "whoever knows the token in this address can read the whole archive" in said
    assert "Traceback" not in said
    assert said.rstrip().endswith("stopped")


def test_a_port_that_is_taken_is_told(root: Path) -> None:
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        with pytest.raises(BadRequest, match="choose another port"):
            serve(root, host="127.0.0.1", port=port, ask_token=False, started=lambda *_: None)
    with pytest.raises(BadRequest, match="no such address on this machine"):
        serve(root, host="no such host.invalid", port=0, ask_token=False, started=lambda *_: None)
