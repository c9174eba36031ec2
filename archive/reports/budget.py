"""The uncertainty budget of a result as the reports print it, and the Monte Carlo run that stands below it."""

from __future__ import annotations

from typing import Any

from archive.reduction.budget import BudgetRow, budget
from archive.reports.numbers import shown_value
from archive.reports.prose import Prose, prose, symbol_of
from schemas.interval_text import contribution_text, interval_text, preferred_unit
from schemas.lineage import OutputEntry, ReductionDocument
from schemas.monte_carlo import MonteCarlo, MonteCarloResult

__all__ = [
    "budget_block",
    "budget_rows",
    "headline_budgets",
    "largest_share",
    "largest_shares",
    "monte_carlo_sentence",
    "percent",
]

_SHARED_BY = {"point": "this point", "run": "this run", "cell": "this cell", "laboratory": "all"}
SMALL = 1e-3
"""Share of the variance below which terms are summed."""


def largest_share(reduction: ReductionDocument, output: OutputEntry) -> tuple[str, float] | None:
    """Return the term with the largest share of the variance, and the share."""
    rows = budget(reduction, output)
    return (rows[0].source, rows[0].share) if rows else None


def largest_shares(reduction: ReductionDocument, output: OutputEntry) -> str:
    """Return the largest shares of a result's variance, three of at least five per cent, in words."""
    rows = [each for each in budget(reduction, output) if each.share >= 0.05][:3]
    return ", ".join(f"{each.source} {percent(each.share)}\u00a0%" for each in rows)


def percent(share: float) -> str:
    """Return a share of a variance in per cent, to two digits, as people read it."""
    if share >= 0.995:
        return f"{100 * share:.0f}"
    return f"{100 * share:.2g}" if share >= 1e-6 else "0"


def budget_rows(reduction: ReductionDocument, output: OutputEntry) -> list[tuple[str, float, float, str]]:
    """Return term, contribution in the output's unit, share and what it is common to; terms below a thousandth are summed."""
    large, rest = _parted(budget(reduction, output), SMALL)
    rows = [(each.source, each.contribution, each.share, _SHARED_BY[each.level]) for each in large]
    if rest:
        rows.append((_small(rest, SMALL), _quadratic(rest), sum(each.share for each in rest), "various"))
    return rows


def _parted(rows: tuple[BudgetRow, ...], least: float) -> tuple[list[BudgetRow], list[BudgetRow]]:
    return [each for each in rows if each.share >= least], [each for each in rows if each.share < least]


def _small(rest: list[BudgetRow], least: float) -> str:
    each = " each" if len(rest) > 1 else ""
    return f"{len(rest)} term{'s' * (len(rest) != 1)} below {100 * least:g} per cent{each}"


def _quadratic(rows: list[BudgetRow]) -> float:
    return float(sum(each.contribution**2 for each in rows) ** 0.5)


def budget_block(
    reduction: ReductionDocument, output: OutputEntry, *, least: float = SMALL
) -> list[dict[str, Prose | str]]:
    """Return the budget of a result as lines of a table: source, what is stated, level, sensitivity, contribution, share.

    Parameters
    ----------
    reduction : ReductionDocument
    output : OutputEntry
    least : float
        Share of the variance below which terms are summed in the last line but one.

    Returns
    -------
    list of dict
        The last line is the combined standard uncertainty; nothing where there is no budget.
    """
    rows = budget(reduction, output)
    if not rows or output.value is None or not output.uncertainty:
        return []
    unit, factor = preferred_unit(output.uncertainty, output.unit, output.quantity)
    large, rest = _parted(rows, least)
    lines = [
        _line(
            each.source,
            stated=_stated(each),
            level=_SHARED_BY[each.level],
            sensitivity=_sensitivity(each, output.unit),
            contribution=contribution_text(each.contribution, unit=unit, factor=factor),
            share=each.share,
        )
        for each in large
    ]
    if rest:
        part = contribution_text(_quadratic(rest), unit=unit, factor=factor)
        lines.append(
            _line(
                _small(rest, least),
                level="various",
                contribution=part,
                share=sum(each.share for each in rest),
            )
        )
    total = contribution_text(output.uncertainty, unit=unit, factor=factor)
    lines.append(
        _line("combined standard uncertainty", contribution=total, share=sum(each.share for each in rows))
    )
    return lines


def _line(
    source: str,
    *,
    contribution: str,
    share: float,
    stated: str = "",
    level: str = "",
    sensitivity: str = "",
) -> dict[str, Prose | str]:
    return {
        "source": prose(source),
        "stated": prose(stated),
        "level": level,
        "sensitivity": prose(sensitivity),
        "contribution": contribution,
        "share": f"{percent(share)} %",
    }


def _stated(row: BudgetRow) -> str:
    stated = row.stated
    if stated is None:
        return ""
    if stated.value is None:
        unit = "" if stated.unit == "1" else f" {stated.unit}"
        return f"u = {stated.uncertainty:.3g}{unit}"
    kind = "rectangular, " if row.distribution == "rectangular" else ""
    return kind + shown_value(stated, "").plain


def _sensitivity(row: BudgetRow, unit: str) -> str:
    if row.sensitivity is None or row.stated is None:
        return ""
    return f"{row.sensitivity:.3g} {_per(unit, row.stated.unit)}".rstrip()


def _per(unit: str, other: str) -> str:
    if other in {unit, "1"}:
        return "" if unit in {other, "1"} else unit
    return f"{unit}/({other})" if any(sign in other for sign in "*/ ") else f"{unit}/{other}"


def monte_carlo_sentence(reduction: ReductionDocument, output: OutputEntry) -> str:
    """Return what the Monte Carlo run found of a result, in a sentence; nothing where there was none."""
    run = reduction.monte_carlo
    found = None if run is None else next((each for each in run.results if each.name == output.name), None)
    if run is None or found is None or output.value is None:
        return ""
    unit, factor = preferred_unit(output.value, output.unit, output.quantity, output.uncertainty)
    p = f"{100 * run.probability:g} per cent"
    head = f"Monte Carlo (JCGM 101), {run.trials} trials, seed {run.seed}"
    lost = run.trials - found.values
    head += f", {lost} of them without this result" if lost else ""
    if found.symmetric is None:
        return f"{head}: too few values for an interval."
    u = output.uncertainty
    unit_u, factor_u = preferred_unit(u or found.uncertainty or 0.0, output.unit, output.quantity)
    return (
        f"{head}: u = {contribution_text(found.uncertainty or 0.0, unit=unit_u, factor=factor_u)}; {p} in "
        f"{interval_text(found.symmetric, uncertainty=u, unit=unit, factor=factor)} (shortest {interval_text(found.shortest, uncertainty=u, unit=unit, factor=factor)}); "
        f"first order {interval_text(found.first_order, uncertainty=u, unit=unit, factor=factor)} {_verdict(run, found)}."
    )


def _verdict(run: MonteCarlo, found: MonteCarloResult) -> str:
    digits = f"{run.digits} digit{'s' * (run.digits != 1)} of the uncertainty"
    if found.agreement == "undecided":
        return f"can be neither confirmed nor refuted to {digits} with so few trials"
    if found.agreement is None:
        return "states no uncertainty"
    return f"{found.agreement}, held to {digits}"


def headline_budgets(reduction: ReductionDocument, *, least: float = 0.01) -> list[dict[str, Any]]:
    """Return the budgets of a reduction's headline results, for a run sheet, with the Monte Carlo run below each."""
    outputs = {each.name: each for each in reduction.outputs if each.rows is None}
    chosen = [outputs[name] for name in reduction.plan.headline if name in outputs]
    blocks = [
        {
            "name": symbol_of(each.name),
            "lines": budget_block(reduction, each, least=least),
            "monte_carlo": monte_carlo_sentence(reduction, each),
        }
        for each in chosen
    ]
    return [each for each in blocks if each["lines"]]
