"""The chart of a page: what is drawn, what may be drawn instead, what lies on the pile, and what can be taken away.

Without a script the page shows a picture that the server drew; a script draws the same points and fetches more when it is
zoomed. The size of the picture is known before anything is read, so that nothing on the page moves.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from starlette.requests import Request

from archive.lab.curves.chart import Outline
from archive.lab.curves.columns import DrawnColumn
from archive.lab.curves.leaf import Leaf
from archive.lab.curves.picture import picture_size
from archive.web.links import path_of
from archive.web.query import asked
from archive.web.shown import Shown, asked_for, question
from archive.web.site import lab_of

__all__ = ["Charting", "Choice", "charting"]

_NARROW = 360


@dataclass(frozen=True)
class Choice:
    """A column that may be drawn."""

    name: str
    column: DrawnColumn
    chosen: bool

    @property
    def words(self) -> str:
        """Its name with what it was made by, for people."""
        by = self.name.partition("@")[2]
        return self.column.words + (f" ({by})" if by else "")


@dataclass(frozen=True)
class Charting:
    """What a template sets of a chart.

    Attributes
    ----------
    address : str
        Of the sweep or the reduction.
    shown : Shown
    outline : Outline
    abscissae, ordinates : tuple of Choice
    elsewhere : tuple of str
        Addresses of arrays of other rows.
    wide, narrow : (int, int)
        Width and height of the picture.
    """

    address: str
    shown: Shown
    outline: Outline
    abscissae: tuple[Choice, ...]
    ordinates: tuple[Choice, ...]
    elsewhere: tuple[str, ...]
    wide: tuple[int, int]
    narrow: tuple[int, int]

    @property
    def path(self) -> str:
        """Path of the thing behind the first part of an address, such as `/2026-03/s017`."""
        return path_of(self.address).removeprefix("/at")

    def points(self) -> str:
        """Where a script fetches points; ordinate and view are added there."""
        return f"/points{self.path}{question(self.shown, y=(), low=None, high=None, against=self.outline.against)}"

    def picture(self, ink: str, *, narrow: bool = False) -> str:
        """Where a browser fetches the picture."""
        return (
            f"/picture{self.path}{self._question(ink=ink, width=(self.narrow if narrow else self.wide)[0])}"
        )

    def file(self, form: str) -> str:
        """Where what is shown is taken away."""
        return f"/download{self.path}{self._question(**{'as': form})}"

    def _question(self, **more: object) -> str:
        return question(self.shown, y=self.names, against=self.outline.against, **more)

    @property
    def names(self) -> tuple[str, ...]:
        """Ordinates that are drawn."""
        return tuple(name for name, _ in self.outline.panels)

    @property
    def below(self) -> tuple[str, ...]:
        """Addresses that are to be laid over, as asked for."""
        return self.shown.over

    def without(self, address: str) -> str:
        """The page without one of these."""
        return path_of(self.address) + question(
            self.shown, over=tuple(each for each in self.shown.over if each != address)
        )

    @property
    def whole(self) -> str | None:
        """The page with all rows in view, where only a part is."""
        if self.shown.low is None and self.shown.high is None:
            return None
        return path_of(self.address) + question(self.shown, low=None, high=None)

    @property
    def words(self) -> str:
        """What is drawn, in words."""
        what = ", ".join(choice.words for choice in self.ordinates if choice.chosen)
        along = next((choice.words for choice in self.abscissae if choice.chosen), "")
        laid = [member.leaf.address for member in self.outline.members[1:]]
        return f"{what} against {along}" + (f", with {', '.join(laid)} laid over" if laid else "")


def charting(request: Request) -> Charting:
    """Return the chart of the address in a request's path.

    Raises
    ------
    UnknownAddress, BadRequest
        If it has none, or the question cannot be answered.
    """
    shown = asked(request, Shown)
    wanted = asked_for(request, shown)
    lab = lab_of(request)
    outline = lab.chart_outline(wanted)
    leaf = outline.members[0].leaf
    names = [name for name, _ in outline.panels]
    sizes = [picture_size(len(names), len(outline.members), width=width) for width in (960, _NARROW)]
    return Charting(
        address=leaf.address,
        shown=shown,
        outline=outline,
        abscissae=tuple(_choices(leaf, {outline.against})),
        ordinates=tuple(
            each
            for each in _choices(leaf, set(names))
            if each.name in leaf.beside(leaf.column(outline.against))
        ),
        elsewhere=leaf.elsewhere,
        wide=sizes[0],
        narrow=sizes[1],
    )


def _choices(leaf: Leaf, chosen: set[str]) -> Iterator[Choice]:
    for name, column in leaf.columns.items():
        yield Choice(name, column, name in chosen)
