"""Compiling LaTeX as strangers' text must be compiled, and reading the text of PDF pages."""

from __future__ import annotations

import os
import shutil
import subprocess
from pathlib import Path

import pytest


def tool(name):
    """Return a program, or skip; where everything is required its absence is a failure."""
    found = shutil.which(name)
    if found is None:
        if os.environ.get("STILLROOM_REQUIRE_ALL") == "1":
            pytest.fail(f"{name} is required and not installed")
        pytest.skip(f"{name} is not installed")
    return found


@pytest.fixture
def compiled(tmp_path):
    """Return a function that compiles an appendix and returns the log of pdflatex and the text of its pages."""

    def compile_(made, name="appendix-alone.tex"):
        tool("pdflatex")
        for file, content in made.items():
            target = tmp_path / file
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_bytes(content)
        # Text of others: no shell, nothing read or written outside the folder, bounded in time.
        command = [
            "timeout",
            "60",
            "env",
            "openin_any=p",
            "openout_any=p",
            "TEXMFOUTPUT=.",
            "pdflatex",
            "-no-shell-escape",
            "-interaction=nonstopmode",
            "-halt-on-error",
            "-file-line-error",
            name,
        ]
        run = subprocess.run(command, cwd=tmp_path, capture_output=True, check=False)
        log = run.stdout.decode(errors="replace")
        assert run.returncode == 0, log[-2000:]
        return log, pages((tmp_path / name).with_suffix(".pdf"))

    return compile_


def pages(file: Path, *, layout: bool = True) -> list[str]:
    """Return the text of each page."""
    run = subprocess.run(
        [tool("pdftotext"), *(["-layout"] if layout else []), str(file), "-"], capture_output=True, check=True
    )
    return run.stdout.decode(errors="replace").split("\f")[:-1]


@pytest.fixture
def text_of(tmp_path):
    """Return a function that returns the text of each page of a PDF."""

    def text(content, *, layout=True):
        file = tmp_path / "sheet.pdf"
        file.write_bytes(content)
        return pages(file, layout=layout)

    return text
