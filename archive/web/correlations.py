"""What a reduction fitted together, as correlations that a page can print."""

from __future__ import annotations

from collections.abc import Iterator

from schemas.lineage import ReductionDocument

__all__ = ["correlations"]

# More digits of a correlation say nothing (common practice, no source).
_DIGITS = 3


def correlations(document: ReductionDocument) -> Iterator[tuple[str, list[str], list[list[str]]]]:
    """Yield step, names, and the correlations of what it fitted: a covariance over the roots of its diagonal.

    Parameters
    ----------
    document : ReductionDocument
    """
    for step, found in document.covariances.items():
        names, matrix = found["names"], found["matrix"]
        roots = [matrix[k][k] ** 0.5 if (matrix[k][k] or 0) > 0 else 0.0 for k in range(len(names))]
        yield (
            step,
            names,
            [
                [
                    _text(matrix[i][j] / (roots[i] * roots[j])) if roots[i] and roots[j] else "[na]"
                    for j in range(len(names))
                ]
                for i in range(len(names))
            ],
        )


def _text(value: float) -> str:
    # Adding nothing makes a rounded minus nought a nought.
    return f"{round(value, _DIGITS) + 0.0:.{_DIGITS}f}".replace("-", "\u2212")
