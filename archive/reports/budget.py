"""The uncertainty budget of a result, from the contributions that its record keeps."""

from __future__ import annotations

from schemas.lineage import OutputEntry, ReductionDocument

__all__ = ["budget_rows", "largest_share", "percent"]

_SHARED_BY = {"run": "this run", "cell": "this cell", "laboratory": "all"}


def _shares(output: OutputEntry) -> list[tuple[str, float, float]]:
    """Return name, signed contribution and share of the variance, largest first."""
    if not output.uncertainty or output.value is None:
        return []
    parts = [("the points of this result alone", output.point or 0.0), *output.shared.items()]
    rows = [(name, part, (part / output.uncertainty) ** 2) for name, part in parts if part]
    return sorted(rows, key=lambda each: (-each[2], each[0]))


def largest_share(output: OutputEntry) -> tuple[str, float] | None:
    """Return the term with the largest share of the variance, and the share."""
    rows = _shares(output)
    return (rows[0][0], rows[0][2]) if rows else None


def percent(share: float) -> str:
    """Return a share of a variance in per cent, to two digits, as people read it."""
    if share >= 0.995:
        return f"{100 * share:.0f}"
    return f"{100 * share:.2g}" if share >= 1e-6 else "0"


def budget_rows(reduction: ReductionDocument, output: OutputEntry) -> list[tuple[str, float, float, str]]:
    """Return term, contribution in the output's unit, share and what it is common to; terms below a thousandth are summed."""
    levels = {each.name: _SHARED_BY[each.level] for each in reduction.sources}
    rows = _shares(output)
    large = [
        (name, part, share, levels.get(name, "this point")) for name, part, share in rows if share >= 1e-3
    ]
    rest = [each for each in rows if each[2] < 1e-3]
    if rest:
        large.append(
            (
                f"{len(rest)} terms below 0.1 per cent each"
                if len(rest) > 1
                else "1 term below 0.1 per cent",
                sum(each[1] ** 2 for each in rest) ** 0.5,
                sum(each[2] for each in rest),
                "various",
            )
        )
    return large
