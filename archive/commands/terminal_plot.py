"""Small plots of characters: braille dots where the stream can write them, else plain signs.

Rules: both axes are named with their units and marked at their ends; a plot has no colour, so that nothing is lost in
a pipe; on a terminal that is too narrow there is no plot, but a sentence.
"""

from __future__ import annotations

import math
import shutil
import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from archive.lab import Archive
    from archive.lab.views import ArrayView

__all__ = ["drawn", "plain_signs", "say_plot", "view_of"]

# The Unicode Standard, block Braille Patterns: U+2800 plus one bit per dot, numbered down the left column, then the
# right one, then the lowest row.
_BLANK: Final = 0x2800
_DOTS: Final = ((0x01, 0x08), (0x02, 0x10), (0x04, 0x20), (0x40, 0x80))
_DOWN, _ACROSS = len(_DOTS), len(_DOTS[0])
# Without braille a cell shows how many of its points there are.
_PLAIN: Final = " .:*"

_WIDTH, _HEIGHT = 72, 14
_NARROWEST: Final = 36


def plain_signs(encoding: str | None) -> bool:
    """Whether a stream of this encoding cannot write braille.

    Examples
    --------
    >>> plain_signs("utf-8"), plain_signs("ascii"), plain_signs(None)
    (False, True, True)
    """
    try:
        chr(_BLANK).encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        return True
    return False


def drawn(
    x: Sequence[float],
    y: Sequence[float],
    *,
    across: str,
    up: str,
    width: int = _WIDTH,
    height: int = _HEIGHT,
    plain: bool = False,
) -> list[str]:
    """Lines of a plot of points; none if there is no point.

    Parameters
    ----------
    x, y : sequence of float
        Points; those that are not finite are left out.
    across, up : str
        Names of the axes with units.
    width, height : int
        Characters of the whole, and of the part with points, at least 36 and 2.
    plain : bool
        ASCII instead of braille.

    Examples
    --------
    >>> print("\\n".join(drawn([0, 1, 2], [0, 1, 2], across="T/K", up="P/us", width=36, height=3, plain=True)))
    P/us
      2 |                             .
        |               .
      0 |.
         0                            2
                                    T/K
    """
    points = [
        (float(a), float(b)) for a, b in zip(x, y, strict=True) if math.isfinite(a) and math.isfinite(b)
    ]
    if not points:
        return []
    left, right = min(a for a, _ in points), max(a for a, _ in points)
    low, high = min(b for _, b in points), max(b for _, b in points)
    top, bottom = _ends(low, high)
    margin = max(len(top), len(bottom)) + 2
    columns = max(width - margin - 3, 4)
    cells = [[0] * columns for _ in range(height)]
    fine = (1, 1) if plain else (_ACROSS, _DOWN)
    for a, b in points:
        i = _place(a, left, right, columns * fine[0])
        j = height * fine[1] - 1 - _place(b, low, high, height * fine[1])
        row, column = j // fine[1], i // fine[0]
        if plain:
            cells[row][column] += 1
        else:
            cells[row][column] |= _DOTS[j % _DOWN][i % _ACROSS]
    bar = "|" if plain else "\N{BOX DRAWINGS LIGHT VERTICAL}"
    marks = {0: top, height - 1: bottom}
    body = [
        f"{marks.get(number, ''):>{margin}} {bar}{''.join(_sign(cell, plain=plain) for cell in row)}".rstrip()
        for number, row in enumerate(cells)
    ]
    end, begin = _ends(left, right)
    foot = " " * (margin + 2) + begin + end.rjust(max(columns - len(begin), len(end) + 1))
    return [up, *body, foot, across.rjust(margin + 2 + columns)]


def _place(value: float, low: float, high: float, steps: int) -> int:
    """Step that a value falls on; the middle one where all are equal."""
    # Halved, so that the span of the largest doubles is still one.
    span = high / 2 - low / 2
    if span <= 0:
        return steps // 2
    share = (value / 2 - low / 2) / span
    return min(int(max(share, 0.0) * steps), steps - 1)


def _sign(cell: int, *, plain: bool) -> str:
    if plain:
        return _PLAIN[min(cell, len(_PLAIN) - 1)]
    return chr(_BLANK + cell) if cell else " "


def _ends(low: float, high: float) -> tuple[str, str]:
    """Texts of the upper and the lower end, to as many digits as tell them apart."""
    for digits in range(4, 17):
        texts = f"{high:.{digits}g}", f"{low:.{digits}g}"
        step = abs(high / 2 - low / 2)
        if step == 0 or max(abs(float(texts[0]) - high), abs(float(texts[1]) - low)) <= 0.01 * step:
            return texts
    return texts


def say_plot(view: ArrayView, name: str | None = None, *, height: int = _HEIGHT) -> None:
    """Write a plot of a sweep or reduction to stdout, or say why there is none.

    Parameters
    ----------
    view : ArrayView
    name : str, optional
        The column to be shown; else one that is usual for such a sweep.
    height : int
        Lines with points.
    """
    from archive.commands.terminal import clean, say
    from archive.lab.views.choice import hours, pair

    width = shutil.get_terminal_size().columns if sys.stdout.isatty() else _WIDTH
    if width < _NARROWEST:
        say(f"{view.address}: the terminal is too narrow for a plot; it needs {_NARROWEST} columns")
        return
    chosen = pair(view.kind, view.columns, name)
    if chosen is None:
        say(f"{view.address}: there is nothing to plot")
        return
    x, y = hours(chosen[0]), chosen[1]
    lines = drawn(
        x.values.tolist(), y.values.tolist(), across=clean(x.label), up=f"{view.address}  {clean(y.label)}",
        width=min(width, _WIDTH), height=height, plain=plain_signs(sys.stdout.encoding),
    )  # fmt: skip
    say("\n".join(lines))


def view_of(lab: Archive, address: str) -> tuple[ArrayView, str | None]:
    """What an address has to be plotted, and the column that it names, if it names one.

    Raises
    ------
    BadRequest
        If it is no sweep, channel, reduction or output of one.
    """
    from archive.errors import BadRequest
    from schemas.address import parse_address

    parsed = parse_address(address)
    if parsed.reduction is not None:
        return lab.reduction(parsed.reduction), parsed.part
    if parsed.sweep is not None and parsed.kind in ("item", "channel"):
        return lab.sweep(parsed.sweep), parsed.part
    raise BadRequest(
        f"{address} has no columns",
        field="--plot",
        expected="a sweep, a channel, a reduction or an output of one",
    )
