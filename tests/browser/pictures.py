"""`python -m tests.browser.pictures`: the pictures of README.md, taken from the pages of the demonstration.

They stand in `archive/demo/pictures`; what they show is made anew each time, so that they never show what is no longer so.
"""

from __future__ import annotations

import argparse
import io
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from PIL import Image
from playwright.sync_api import Browser, FloatRect, sync_playwright

from tests.browser.served import served

__all__ = ["FOLDER", "PICTURES", "Picture", "take"]

FOLDER: Final = Path(__file__).parents[2] / "archive" / "demo" / "pictures"
_COLOURS = 128


@dataclass(frozen=True)
class Picture:
    """A part of a page: name of the file, path, width and height in px from the top of an element on (None: all of it), and what is there when all is drawn."""

    name: str
    path: str
    size: tuple[int, int | None]
    begin: str = "body"
    ready: str = "main"


PICTURES: Final = (
    Picture("plane", "/", (1200, 905), ready=".scripted"),
    Picture("sweep", "/at/2025-03/s006?y=period&y=amplitude", (1200, 845), ready=".chart[data-ready=yes]"),
    Picture("cell", "/at/TO-4", (1000, None), begin="figure.timeline"),
    Picture("run-sheet", "/run-sheet/2025-03.html", (900, 745), ready="body"),
)


def take(browser: Browser, address: str, folder: Path) -> Iterator[Path]:
    """Take every picture from a server of the demonstration's archive.

    Parameters
    ----------
    browser : Browser
    address : str
        Of the server, without a solidus at its end.
    folder : Path
        Where the PNG files go.
    """
    for each in PICTURES:
        context = browser.new_context(
            base_url=address,
            viewport={"width": each.size[0], "height": 820},
            color_scheme="light",
            locale="en-GB",
        )
        page = context.new_page()
        if each.path.startswith("/run-sheet/"):
            # A run sheet is handed over as a file.
            page.set_content(context.request.get(each.path).text())
        else:
            page.goto(each.path)
        page.wait_for_selector(each.ready)
        page.wait_for_load_state("networkidle")
        box = page.locator(each.begin).first.bounding_box()
        assert box is not None, each.begin
        width, height = each.size
        clip: FloatRect = {"x": 0, "y": box["y"], "width": width, "height": height or box["height"]}
        shot = page.screenshot(clip=clip, full_page=True)
        context.close()
        # Pages have few colours; a palette makes a third of the file.
        picture = (
            Image.open(io.BytesIO(shot))
            .convert("RGB")
            .quantize(_COLOURS, Image.Quantize.MAXCOVERAGE, dither=Image.Dither.NONE)
        )
        path = folder / f"{each.name}.png"
        picture.save(path, optimize=True)
        yield path


def _main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--archive", type=Path, help="archive of a demonstration; made anew if left out")
    parser.add_argument("--to", type=Path, default=FOLDER)
    given = parser.parse_args()
    chromium = shutil.which("chromium")
    if chromium is None:
        raise SystemExit("there is no chromium here; install the package of the system")
    given.to.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory(prefix="stillroom-pictures-") as made, sync_playwright() as playwright:
        root = given.archive or _demonstration(Path(made))
        browser = playwright.chromium.launch(executable_path=chromium, args=["--no-sandbox", "--disable-gpu"])
        with served(root) as address:
            for path in take(browser, address, given.to):
                sys.stdout.write(f"{path}, {path.stat().st_size} bytes\n")
        browser.close()


def _demonstration(folder: Path) -> Path:
    command = [
        sys.executable,
        "-c",
        "from archive.commands.main import main; main()",
        "demo",
        str(folder / "demo"),
    ]
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    return folder / "demo" / "archive"


if __name__ == "__main__":
    _main()
