"""A server of an archive, started as a person starts it."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

__all__ = ["served"]


@contextmanager
def served(root: Path) -> Iterator[str]:
    """Give the address of a server of an archive, without a solidus at its end; it must end without noise."""
    command = [sys.executable, "-c", "from archive.commands.main import main; main()", "serve", "--port", "0"]
    environment = {**os.environ, "STILLROOM_ARCHIVE": str(root), "PYTHONUNBUFFERED": "1"}
    with subprocess.Popen(command, stdout=subprocess.PIPE, env=environment, text=True) as process:
        assert process.stdout is not None
        said = process.stdout.readline()
        try:
            yield said.rpartition(" ")[2].strip().rstrip("/")
        finally:
            process.send_signal(signal.SIGINT)
            assert process.wait(timeout=15) == 0
