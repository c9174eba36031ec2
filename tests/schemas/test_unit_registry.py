"""The disk cache of the units library holds pickles; one that somebody else could have written is not read."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

from schemas.unit_registry import root

PROGRAM = "from schemas.unit_registry import root; print(root('pascal')[0])"


def _factor(cache: Path) -> str:
    ended = subprocess.run(
        [sys.executable, "-c", PROGRAM], capture_output=True, text=True, check=True,
        env={**os.environ, "XDG_CACHE_HOME": str(cache)}, cwd=Path(__file__).parents[2],
    )  # fmt: skip
    return ended.stdout.strip()


@pytest.mark.skipif(
    sys.platform != "linux", reason="where the cache lies is told by an environment variable here"
)
def test_a_cache_that_others_can_write_to_is_not_read(tmp_path: Path) -> None:
    assert _factor(tmp_path) == str(root("pascal")[0])
    (folder,) = (tmp_path / "stillroom").iterdir()
    assert folder.stat().st_mode & 0o077 == 0
    files = [path for path in folder.iterdir() if path.suffix == ".pickle"]
    assert files
    # A pickle that would leave a mark if it were read: os.system("touch MARK").
    mark = tmp_path / "mark"
    evil = f"cposix\nsystem\n(S'touch {mark}'\ntR.".encode()
    for path in files:
        path.write_bytes(evil)
    folder.chmod(0o775)
    assert _factor(tmp_path) == str(root("pascal")[0])
    assert not mark.exists()
    folder.chmod(0o700)
    _factor(tmp_path)
    assert mark.exists(), (
        "the pickle of this test is not read even where it may be, so the test shows nothing"
    )
