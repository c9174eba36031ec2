"""Pictures of charts: plain SVG, readable on both papers, the same every time."""

from __future__ import annotations

import json
import re
import xml.etree.ElementTree as ET
from importlib.resources import files

import pytest

from archive import Archive
from archive.lab.curves.chart import Asked
from archive.lab.curves.ink import INKS, LOOKS
from archive.lab.curves.picture import picture, picture_pdf, picture_size

_SVG = "{http://www.w3.org/2000/svg}"


def _luminance(colour: str) -> float:
    """Relative luminance by WCAG 2.2, "relative luminance"."""
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [each / 12.92 if each <= 0.04045 else ((each + 0.055) / 1.055) ** 2.4 for each in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def _contrast(one: str, two: str) -> float:
    high, low = sorted((_luminance(one), _luminance(two)), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("ink", ["light", "dark"])
def test_every_curve_and_letter_stands_out_from_its_paper(ink: str) -> None:
    colours = INKS[ink]
    for each in (colours.text, *colours.curves):
        assert _contrast(each, colours.paper) >= 4.5, each
    assert len(colours.curves) == len(LOOKS) == len(set(LOOKS)) == len({mark for mark, _ in LOOKS})


def test_pictures_and_pages_have_the_same_colours() -> None:
    """The style sheet names those of light paper first, then those of dark; a script reads them there."""
    sheet = files("templates").joinpath("web", "style", "stillroom.css").read_text(encoding="utf-8")
    for ink, colours in INKS.items():
        part = sheet[sheet.index("prefers-color-scheme: dark") if ink == "dark" else 0 :]
        looks = [re.search(rf"--look-{number}: (#[0-9a-f]{{6}})", part)[1] for number in range(len(LOOKS))]
        assert tuple(looks) == colours.curves
        assert [re.search(rf"--{name}: (#[0-9a-f]{{6}})", part)[1] for name in ("paper", "ink")] == [
            colours.paper,
            colours.text,
        ]


def test_a_script_knows_the_marks_and_dashes() -> None:
    script = files("templates").joinpath("web", "scripts", "chart.js").read_text(encoding="utf-8")
    marks = json.loads(re.search(r"MARKS = (\[.*?\]);", script)[1])
    dashes = json.loads(re.search(r"DASHES = (\[.*\]);", script)[1])
    assert [(mark, " ".join(map(str, dash))) for mark, dash in zip(marks, dashes, strict=True)] == list(LOOKS)


def test_a_picture_is_plain_svg_of_the_size_that_was_said(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s002", columns=("period", "signal"), over=("2026-04/s002",)))
    drawn = picture(chart)
    assert drawn == picture(
        lab.chart(Asked("2026-03/s002", columns=("period", "signal"), over=("2026-04/s002",)))
    )
    root = ET.fromstring(drawn)  # noqa: S314 - our own
    assert (int(root.get("width", "")), int(root.get("height", ""))) == picture_size(2, 2)
    for each in root.iter():
        assert each.tag not in (f"{_SVG}style", f"{_SVG}script", f"{_SVG}foreignObject")
        assert not [name for name in each.attrib if name == "style" or name.startswith("on")]
    words = [each.text for each in root.iter(f"{_SVG}text")]
    assert {"T / mK (ITS-90)", "A / mV", "period", "signal", "2026-03/s002", "2026-04/s002"} <= set(words)


def test_marks_stand_where_the_numbers_are(lab: Archive) -> None:
    """The first and the last of 60 points on an axis with 2 % to spare on both sides."""
    drawn = picture(lab.chart(Asked("2026-03/s002", columns=("period",))))
    marks = max((each.get("d", "") for each in ET.fromstring(drawn).iter(f"{_SVG}path")), key=len)  # noqa: S314
    places = [float(each.split(" ")[0]) for each in marks.split("M")[1:]]
    left, right = 84.0, 946.0
    assert len(places) == 60
    assert places[0] == pytest.approx(left + 0.02 / 1.04 * (right - left), abs=0.06)
    assert places[-1] == pytest.approx(right - 0.02 / 1.04 * (right - left), abs=0.06)


def test_a_picture_becomes_a_pdf(lab: Archive) -> None:
    content = picture_pdf(lab.chart(Asked("2026-03/s002")))
    assert content.startswith(b"%PDF-")
    assert b"/Subtype /Image" not in content.replace(b"/Subtype/Image", b"/Subtype /Image")
