"""The pictures of README.md: all there, all used, small, and told in words."""

from __future__ import annotations

import re
from pathlib import Path

from PIL import Image

from tests.browser.pictures import FOLDER, PICTURES

_README = Path(__file__).parents[3] / "README.md"


def test_the_pictures_of_the_readme_are_those_that_the_command_takes() -> None:
    shown = re.findall(r"!\[([^\]]*)\]\(([^)]*)\)", _README.read_text(encoding="utf-8"))
    paths = {_README.parent / path for _, path in shown}
    assert paths == {FOLDER / f"{each.name}.png" for each in PICTURES} == set(FOLDER.iterdir())
    assert all(len(words) > 60 for words, _ in shown)
    for each in PICTURES:
        path = FOLDER / f"{each.name}.png"
        assert path.stat().st_size < 100_000
        with Image.open(path) as picture:
            assert picture.width == each.size[0]
            assert each.size[1] in (None, picture.height)
