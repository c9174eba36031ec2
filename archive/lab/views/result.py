"""One number that a reduction found, with uncertainty, unit and where it stands."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from typing_extensions import override

from archive.lab.views.html import described, fragment
from archive.lab.views.pint_units import pint_quantity
from schemas.lineage import OutputEntry

if TYPE_CHECKING:
    import pint

__all__ = ["Result"]


@dataclass(frozen=True, repr=False)
class Result:
    """A scalar result of a reduction.

    Attributes
    ----------
    address : str
        Such as `2026-03/s017@film-transition.2#T_KT`; what to cite, and what `Archive.trace` takes.
    name, kind, unit, description : str
        `kind` is the kind of quantity; `unit` that of `value`.
    value : float or None
        None if there is no number; then `verdict` says why.
    uncertainty : float or None
        Combined standard uncertainty in `unit`, coverage factor 1 (JCGM 100:2008, 2.3.4).
    scale : str or None
        Temperature scale.
    verdict : str or None
        A word instead of a number, such as `no resonance in range`.
    marks : tuple of str
        What was said of it later: withdrawn, superseded.
    """

    address: str
    entry: OutputEntry
    marks: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        """Name in the plan."""
        return self.entry.name

    @property
    def kind(self) -> str:
        """Kind of quantity."""
        return self.entry.quantity

    @property
    def unit(self) -> str:
        """Unit of value and uncertainty."""
        return self.entry.unit

    @property
    def description(self) -> str:
        """What it is, in words."""
        return self.entry.description

    @property
    def value(self) -> float | None:
        """Value in `unit`."""
        return self.entry.value

    @property
    def uncertainty(self) -> float | None:
        """Combined standard uncertainty in `unit`."""
        return self.entry.uncertainty

    @property
    def scale(self) -> str | None:
        """Temperature scale."""
        return self.entry.scale

    @property
    def verdict(self) -> str | None:
        """Word instead of a number."""
        return self.entry.verdict

    def quantity(self) -> pint.Quantity[Any]:
        """Value with its unit, as a quantity of pint; NaN where there is no number."""
        return pint_quantity(float("nan") if self.value is None else self.value, self.unit)

    @override
    def __repr__(self) -> str:
        from archive.reports.numbers import (
            shown_output,
        )  # what draws takes longer to import than a search to answer

        told = f" [{'; '.join(self.marks)}]" if self.marks else ""
        return f"<{self.address}: {shown_output(self.entry).plain}{told}>"

    def _repr_html_(self) -> str:
        from archive.reports.numbers import shown_output  # as above

        content = {
            "value": shown_output(self.entry).text,
            "what": self.description,
            "scale": self.scale or "",
            "verdict": self.verdict or "",
        }
        return fragment(self.address, described(content), marks=self.marks)
