"""Colours and marks of curves, for light paper and dark; told apart by mark and line in grey.

Colours are those of the appendix's figures and of the style sheet of the pages (`--look-0` to `--look-6`);
on dark paper each has a lighter one of its hue. Each is at least 4.5 to 1 against
its paper (WCAG 2.2, success criterion 1.4.3), which `tests/archive/lab/curves/test_picture.py` works out.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

__all__ = ["INKS", "LOOKS", "Ink", "InkName"]

InkName = Literal["light", "dark"]


@dataclass(frozen=True)
class Ink:
    """Colours of one paper.

    Attributes
    ----------
    paper, text, rule : str
        Ground, letters and axes, and the fine lines of the grid.
    curves : tuple of str
        One for each look.
    """

    paper: str
    text: str
    rule: str
    curves: tuple[str, ...]


INKS: Final[dict[InkName, Ink]] = {
    "light": Ink("#fdfcf8", "#1c1b19", "#dad5c8",
                 ("#000000", "#0b5394", "#a61c00", "#38761d", "#674ea7", "#7f6000", "#444444")),
    "dark": Ink("#16181a", "#e8e4da", "#3a3833",
                ("#f4f2ec", "#8ab4e8", "#f0957f", "#93c47d", "#b4a7d6", "#d9b84a", "#b0b0b0")),
}  # fmt: skip

LOOKS: Final[tuple[tuple[str, str], ...]] = (
    ("circle", ""),
    ("triangle", "9 3 2 3"),
    ("down", "2 3"),
    ("diamond", "12 3"),
    ("cross", "5 2"),
    ("plus", "9 2 2 2 2 2"),
    ("square", "7 3"),
)
"""Mark and dashes of each curve, in the order of the pile; they begin again after the last."""
