"""Lists of answers that show themselves as a table in a notebook."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Generic, TypeVar

from archive.index import CooldownRow, ResultRow, SweepRow
from archive.lab.views.frames import rows_as_dataframe
from archive.lab.views.html import fragment, grid

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["RowList"]

Row = TypeVar("Row", SweepRow, ResultRow, CooldownRow)

# A notebook is read, not scrolled through.
_MOST = 40
# Headline results stand first in a row.
_FEW = 3


class RowList(list[Row], Generic[Row]):
    """A list of sweeps, results or cooldowns; a plain list in every other way.

    Examples
    --------
    >>> RowList([])._repr_html_()
    '<div class="stillroom"><div><strong>nothing found</strong></div></div>'
    """

    def to_pandas(self) -> pd.DataFrame:
        """Table of pandas with a row for each, in SI units as `archive.index.answers` states them.

        Raises
        ------
        BadRequest
            If pandas is not installed.
        """
        return rows_as_dataframe(self)

    def _repr_html_(self) -> str:
        if not self:
            return fragment("nothing found")
        first = self[0]
        for kind, noun, heads, line in _LOOKS:
            if isinstance(first, kind):
                many = f"{len(self)} {noun}{'' if len(self) == 1 else 's'}"
                return fragment(many, grid(heads, map(line, self[:_MOST]), more=len(self) - _MOST))
        return fragment(f"{len(self)} rows")


def _number(value: float | None, uncertainty: float | None = None) -> str:
    if value is None:
        return ""
    if uncertainty:
        from schemas.uncertain_text import rounded

        return rounded(value, uncertainty).plain()
    return f"{value:.6g}"


def _sweep(row: SweepRow) -> Sequence[str]:
    ends = (row.temperature_low, row.temperature_high)
    coverage = None if row.coverage is None else row.coverage * 1e6
    spread = None if row.coverage_uncertainty is None else row.coverage_uncertainty * 1e6
    results = "; ".join(
        f"{each.name} = {each.verdict or _number(each.value, each.uncertainty)} {'' if each.unit == '1' else each.unit}".strip()
        for each in row.results[:_FEW]
    )
    results += f"; {len(row.results) - _FEW} more" if len(row.results) > _FEW else ""
    marks = "; ".join(
        [
            *([f"withdrawn: {row.withdrawn}"] if row.withdrawn else []),
            *(["amended"] if row.amended else []),
            *(["rests on something withdrawn"] if row.flagged else []),
        ]
    )
    begin = "" if row.begin is None else f"{row.begin:%Y-%m-%d %H:%M}"
    return (
        row.address,
        row.kind,
        begin,
        row.cell or "",
        _number(coverage, spread),
        " to ".join(_number(each) for each in ends if each is not None),
        results,
        marks,
    )


def _result(row: ResultRow) -> Sequence[str]:
    value = row.verdict or _number(row.value, row.uncertainty)
    marks = ["withdrawn"] * row.withdrawn + ["rests on something withdrawn"] * row.flagged
    return f"{row.reduction}#{row.name}", value, row.unit, row.cell or "", "; ".join(marks)


def _cooldown(row: CooldownRow) -> Sequence[str]:
    begin = "" if row.begin is None else f"{row.begin:%Y-%m-%d}"
    return row.name, begin, row.cell or "", row.outcome or "", str(row.sweeps), str(row.reductions)


_LOOKS: tuple[tuple[type, str, tuple[str, ...], Callable[..., Sequence[str]]], ...] = (
    (
        SweepRow,
        "sweep",
        ("sweep", "kind", "begin (UTC)", "cell", "µmol/m²", "K", "results", "marks"),
        _sweep,
    ),
    (ResultRow, "result", ("result", "value", "unit", "cell", "marks"), _result),
    (CooldownRow, "cooldown", ("cooldown", "begin", "cell", "outcome", "sweeps", "reductions"), _cooldown),
)
