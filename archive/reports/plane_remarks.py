"""What the plane says of itself: what it shows and leaves out, and what its lines are."""

from __future__ import annotations

from collections.abc import Iterator

from archive.physics.film_static import onset_coverage
from archive.reports.plane_layout import height_unit
from archive.reports.plane_view import PlaneAxis, PlaneView
from archive.reports.plane_words import line_words

__all__ = ["TITLES", "jump_words", "line_remarks", "pore_words", "remarks"]

TITLES: dict[PlaneAxis, str] = {
    "coverage": "Coverage against temperature",
    "pressure": "Pressure against temperature",
    "cell": "Cells against temperature",
}


def remarks(view: PlaneView) -> Iterator[str]:
    """Yield sentences on what is shown, what is merged, and what is left out."""
    shown = len(view.bars) + view.merged
    yield (
        f"{_count(view.sweeps, 'sweep')}, {shown} of them shown."
        if view.outside is not None
        else f"{_count(shown, 'sweep')} in this part of the plane."
    )
    if view.outside:
        yield f"{_count(view.outside, 'sweep')} beyond the edges."
    for what, count in view.unplaced:
        yield f"{_count(count, 'sweep')} without {what}."
    if view.merged:
        yield (
            f"{view.merged} bars are too many to be told apart: they are merged into {len(view.strips)} strips, each of which reaches exactly "
            "as far as its bars. Look closer to see them one by one."
        )
    if view.thinned:
        yield f"{_count(view.thinned, 'transition')} left out where others of the same cell stand at the same place; the outermost are all here."


def jump_words() -> str:
    """Return what the lines are."""
    per_kelvin = float(onset_coverage(1.0, inert_coverage=0.0)) * height_unit("coverage").per_si
    return (
        f"Broken lines: the coverage at which a flat film becomes superfluid by the universal jump alone, {per_kelvin:.3f} {height_unit('coverage').text} per kelvin "
        "above its inert layer (Nelson and Kosterlitz, Phys. Rev. Lett. 39, 1201, 1977). What thermal excitations take away is not in it, so that "
        "films are expected above their line."
    )


def line_remarks(view: PlaneView) -> Iterator[str]:
    """Yield sentences on the lines: what they are, what they rest on, and which cells have none."""
    if view.lines:
        yield jump_words()
        yield from (f"{line_words(line)}{line.source or ''}." for line in view.lines)
    if view.in_pores:
        yield pore_words(view)


def pore_words(view: PlaneView) -> str:
    """Return which cells have no line, and why."""
    return f"{', '.join(view.in_pores)}: no line, since a film on the walls of pores has no universal jump."


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"
