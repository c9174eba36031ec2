"""One hostile cooldown from the check to the export: what people write is data wherever it is shown."""

from __future__ import annotations

import csv
import io
import os
import re
import shutil
import subprocess
import unicodedata
from collections.abc import Callable
from html.parser import HTMLParser
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from typing_extensions import override

from archive import Archive
from archive.commands.main import stillroom
from archive.index import SearchQuery
from tests.fuzz.hostile import EVIL, FILE, hostile_folder
from tests.outside import missing

Run = Callable[..., Result]


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a folder with the archive `lab`, into which the cooldown was taken and reduced, and what came out of it."""
    folder = tmp_path_factory.mktemp("hostile")
    taken = hostile_folder(folder / "in")
    with Archive.create(folder / "lab", name=EVIL) as lab:
        assert lab.ingest(taken).state == "ingested"
        assert lab.reduce("2026-03", plan="empty-cell")[0].problem is None
        lab.withdraw("2026-03/s002", why=EVIL, by=EVIL)
    for words in (
        ("run-sheet", "2026-03", "-o", str(folder / "sheet")),
        ("appendix", "2026-03", "-o", str(folder / "appendix"), "--title", EVIL.replace("\x00", "")),
        ("export", "2026-03", "--appendix", "-o", str(folder / "package")),
    ):
        ended = CliRunner().invoke(
            stillroom, [*words, "--archive", str(folder / "lab")], catch_exceptions=False
        )
        assert ended.exit_code == 0, ended.output
    return folder


@pytest.fixture
def run(place: Path) -> Run:
    """Run a command on the archive."""

    def command(*words: str) -> Result:
        asked = [*words, "--archive", str(place / "lab")]
        return CliRunner().invoke(stillroom, asked, catch_exceptions=False)

    return command


def _steering(text: str) -> set[str]:
    """Give the characters of a text that could steer a terminal, or turn the direction of writing."""
    return {
        f"U+{ord(sign):04X}"
        for sign in set(text) - set("\n\r\t")
        if unicodedata.category(sign) in ("Cc", "Cs") or unicodedata.bidirectional(sign) in _TURNING
    }


_TURNING = {"LRE", "LRO", "RLE", "RLO", "PDF", "LRI", "RLI", "FSI", "PDI"}


@pytest.mark.parametrize(
    "words",
    [
        ("search",),
        ("search", "DROP", "TABLE"),
        ("search", EVIL[:80]),
        ("search", "--csv", "--withdrawn"),
        ("search", "--json", "--withdrawn"),
        ("search", "--withdrawn"),
        ("show", "2026-03"),
        ("show", "bob.r1"),
        ("show", "plastic.r1"),
        ("show", "well-helium.r1"),
        ("show", "2026-03/d01"),
        ("show", "2026-03/s002"),
        ("show", "2026-03/s002#period"),
        ("show", f"2026-03.a1:{FILE}"),
        ("show", "2026-03", "--json"),
        ("trace", "2026-03/s001@empty-cell.1#empty_period"),
        ("trace", f"2026-03.a1:{FILE}", "--forward"),
        ("journal",),
        ("prov", "2026-03"),
        ("prov", "2026-03", "--format", "provn"),
        ("stale",),
        ("fixity",),
    ],
    ids=lambda words: " ".join(words)[:40].encode("ascii", "backslashreplace").decode(),
)
def test_no_command_lets_a_control_code_through(run: Run, words: tuple[str, ...]) -> None:
    ended = run(*words)
    assert ended.exit_code == 0, ended.output
    assert _steering(ended.stdout + ended.stderr) == set()


def test_the_check_and_the_draft_let_none_through(place: Path) -> None:
    for words in (("check", str(place / "in")), ("draft", str(place / "in"), "--print")):
        ended = CliRunner().invoke(stillroom, list(words), catch_exceptions=False)
        assert _steering(ended.output) == set()


def test_the_texts_are_kept_as_they_were_written(place: Path) -> None:
    with Archive.open(place / "lab") as lab:
        assert lab.name == EVIL
        assert lab._source.accessions("2026-03")[0].sheet.purpose == f"{EVIL} [purpose]"
        assert [row.address for row in lab.search(SearchQuery(text="DROP TABLE"))] == ["2026-03/s001"]
        assert lab.search(SearchQuery(text="' OR 1=1 --")) == []
        assert b"".join(lab._store.raw("2026-03/2026-03.a1", FILE)) == EVIL.encode()


class _Elements(HTMLParser):
    """Collects what a browser would make of a page."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: set[str] = set()
        self.attributes: set[str] = set()
        self.addresses: list[str] = []

    @override
    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.add(tag)
        self.attributes |= {name for name, _ in attrs}
        self.addresses += [
            value or "" for name, value in attrs if name in ("href", "src", "xlink:href", "action")
        ]


def test_the_page_holds_no_element_of_theirs(place: Path) -> None:
    page = (place / "sheet" / "run-sheet-2026-03.html").read_text(encoding="utf-8")
    seen = _Elements()
    seen.feed(page)
    assert not seen.tags & {"script", "img", "iframe", "object", "embed", "form", "base"}
    assert not [name for name in seen.attributes if name.startswith("on")]
    assert all(address.startswith("#") for address in seen.addresses)
    assert "&lt;script&gt;alert(1)" in page
    assert "{{7*7}}" in page
    assert "&lt;b&gt;input" in page
    assert _steering(page) == set()


def test_nothing_that_was_written_for_people_steers(place: Path) -> None:
    """Texts beside the sealed files; documents and sheets are verbatim, and excepted."""
    checked = 0
    for path in (
        *(place / "sheet").rglob("*"),
        *(place / "appendix").rglob("*"),
        *(place / "package").rglob("*"),
    ):
        if (
            path.is_file()
            and path.suffix not in (".pdf", ".h5")
            and not {"documents", "sheets"} & set(path.parts)
        ):
            assert _steering(path.read_text(encoding="utf-8")) == set(), path.name
            checked += 1
    assert checked > 20


def test_the_paper_prints_what_was_written(place: Path) -> None:
    paper = place / "sheet" / "run-sheet-2026-03.pdf"
    assert paper.read_bytes().startswith(b"%PDF-")
    if shutil.which("pdftotext") is None:
        missing("pdftotext is not installed")
    ended = subprocess.run(["pdftotext", paper, "-"], capture_output=True, text=True, check=True)
    assert "7*7" in re.sub(r"[\s\u200b]", "", ended.stdout)


def test_no_text_is_a_command_of_latex(place: Path) -> None:
    for path in (place / "appendix").glob("*.tex"):
        text = path.read_text(encoding="utf-8")
        assert text.isascii()
        # A comment ends with its line, and no text of theirs makes a new one.
        text = "".join(line for line in text.splitlines(keepends=True) if not line.startswith("%"))
        for command in (r"\immediate", r"\write", r"\catcode", r"\def\x", "^^5c", r"\input{/", r"\openin"):
            assert command not in text, (path.name, command)


@pytest.mark.latex
def test_the_appendix_is_set_and_reads_no_file(place: Path, tmp_path: Path) -> None:
    if shutil.which("pdflatex") is None:
        missing("pdflatex is not installed")
    folder = shutil.copytree(place / "appendix", tmp_path / "appendix")
    ended = subprocess.run(
        ["pdflatex", "-no-shell-escape", "-interaction=nonstopmode", "-halt-on-error", "appendix-alone.tex"],
        cwd=folder, capture_output=True, text=True, errors="replace", check=False, timeout=120,
        env={**os.environ, "openin_any": "p", "openout_any": "p"},
    )  # fmt: skip
    assert ended.returncode == 0, ended.stdout[-2000:]
    assert "/etc/passwd)" not in ended.stdout
    assert "runsystem" not in ended.stdout
    assert not (folder / "owned").exists()


def test_no_cell_of_csv_is_a_formula(place: Path, run: Run) -> None:
    texts = [(place / "package" / "data" / "results.csv").read_text(encoding="utf-8")]
    texts.append(run("search", "--csv", "--withdrawn").stdout)
    assert "WITHDRAWN" in texts[1]
    for text in texts:
        for row in csv.reader(io.StringIO(text)):
            for cell in row:
                assert not cell.startswith(("=", "@", "\t", "\r")), cell
                assert not cell.startswith(("+", "-")) or float(cell) is not None


def test_nothing_was_written_elsewhere(place: Path) -> None:
    assert {path.name for path in place.iterdir()} == {"in", "lab", "sheet", "appendix", "package"}
    assert not list(place.rglob("owned"))
    safe = re.compile(r"[A-Za-z0-9@._-]+")
    for folder in ("lab", "sheet", "appendix", "package"):
        assert all(safe.fullmatch(path.name) for path in (place / folder).rglob("*"))
