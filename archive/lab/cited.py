"""What a person points at in a report: an address, a step, the comment or mark of a sentence, a figure or its mark."""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from archive.errors import BadRequest
from archive.store.plain_text import plain_text
from schemas.address import parse_address

__all__ = ["Cited", "is_mark", "parts_of", "sources_of_figure", "sources_of_mark"]

_LISTING = "appendix.json"
_LARGEST = 100_000_000  # bytes; that of sixty-seven reductions has two million
_CITED = re.compile(r"^\s*%\s*[A-Za-z]+[0-9]*\s*\|\s*")
_MARK = re.compile(r"^(?P<folder>.*)#(?P<mark>[sf][1-9][0-9]{0,5})\Z", re.DOTALL)


@dataclass(frozen=True)
class Cited:
    """What a mark stands for: the sentence or caption, and the addresses and steps that it rests on."""

    text: str
    sources: tuple[str, ...]


def is_mark(text: str) -> bool:
    """Whether a text is a mark of an appendix with its folder before it, or alone inside that folder."""
    found = _MARK.match(text)
    return found is not None and (not found["folder"] or (_folder(found["folder"]) / _LISTING).is_file())


def sources_of_mark(text: str) -> Cited:
    """Return what a mark of a methods appendix stands for.

    Parameters
    ----------
    text : str
        Folder of the appendix, or its ``appendix.json``, then ``#`` and the mark, as in ``thesis/appendix#s17``.

    Raises
    ------
    BadRequest
        If there is no appendix in the folder, it cannot be read, or it has no such mark.
    """
    found = _MARK.match(text)
    folder = _folder("" if found is None else found["folder"])
    if found is None or not (folder / _LISTING).is_file():
        raise BadRequest(
            "there is no appendix here", file=str(folder / _LISTING), found=text,
            expected="the folder of an appendix before the mark, as in thesis/appendix#s17",
        )  # fmt: skip
    told = _read(folder / _LISTING)
    mark = found["mark"]
    if mark in told["figures"]:
        figure = told["figures"][mark]
        return Cited(f"figure {figure['file']}", tuple(figure["reductions"]))
    if mark not in told["sentences"]:
        counts = [f"{kind}1 to {kind}{len(told[name])}" for kind, name in (("s", "sentences"), ("f", "figures"))]  # fmt: skip
        raise BadRequest(
            "the appendix has no such mark", file=str(folder / _LISTING), found=mark,
            expected=" and ".join(counts), remedy="an appendix made by an earlier version has none; write it anew",
        )  # fmt: skip
    record, sentence = told["sentences"][mark]
    return Cited(sentence, tuple(parts_of(record)))


def _folder(text: str) -> Path:
    path = Path(text)
    return path.parent if path.name == _LISTING else path


def _read(listing: Path) -> dict[str, dict[str, Any]]:
    """Sentences (record, text) and figures of an appendix by mark; figures of one without marks by file."""
    sentences: dict[str, Any] = {}
    figures: dict[str, Any] = {}
    try:
        for section in json.loads(plain_text(listing, at_most=_LARGEST))["sections"]:
            for said in section.get("sentences", ()):
                sentences[str(said.get("mark"))] = (str(said["record"]), str(said["text"]))
            for block in section.get("steps", ()):
                told = zip(block.get("marks", ()), block["sentences"], strict=False)
                for number, (mark, text) in enumerate(told, 1):
                    sentences[str(mark)] = (f"{block['reduction']} step {number}", str(text))
            for figure in section["figures"]:
                known = {
                    "file": str(figure["file"]),
                    "reductions": [str(each) for each in figure["reductions"]],
                }
                figures[str(figure.get("mark", figure["file"]))] = known
    except (OSError, ValueError, KeyError, TypeError, AttributeError, RecursionError) as error:
        raise BadRequest("this is no appendix of Stillroom", file=str(listing), found=str(error)) from None
    sentences.pop("None", None)
    return {"sentences": sentences, "figures": figures}


def parts_of(text: str) -> list[str]:
    """Addresses and steps that a text cites; a raw file may have a semicolon in its name.

    Examples
    --------
    >>> parts_of("% R21 | 2026-03/s017@film-transition.2 step 4; 2026-03/s001@empty-cell.1 step 1")
    ['2026-03/s017@film-transition.2 step 4', '2026-03/s001@empty-cell.1 step 1']
    >>> parts_of("2026-03.a1:raw/first;second.csv")
    ['2026-03.a1:raw/first;second.csv']
    """
    try:
        parse_address(text)
    except ValueError:
        return [part.strip() for part in _CITED.sub("", text).split(";") if part.strip()]
    return [text]


def sources_of_figure(path: Path) -> list[str]:
    """Addresses of the reductions that a figure of a methods appendix was drawn from.

    Parameters
    ----------
    path : Path
        The figure's file, in the folder of its ``appendix.json`` or one below.

    Raises
    ------
    BadRequest
        If no ``appendix.json`` is there, it cannot be read, or it does not tell of the figure.
    """
    folder = path.resolve().parent
    listing = next((each / _LISTING for each in (folder, folder.parent) if (each / _LISTING).is_file()), None)
    if listing is None:
        raise BadRequest(
            "this figure's appendix is not there", file=str(path), expected="appendix.json beside it or one folder up",
            remedy="give the figure's path inside the folder that `stillroom appendix` wrote, or an address",
        )  # fmt: skip
    figures = _read(listing)["figures"].values()
    told = next((figure["reductions"] for figure in figures if Path(figure["file"]).name == path.name), None)
    if not told:
        raise BadRequest("the appendix does not tell of this figure", file=str(listing), found=path.name)
    return [str(each) for each in told]
