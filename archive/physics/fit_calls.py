"""The residual function as a search sees it: in scaled parameters, counted, finite everywhere, with derivatives."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from archive.physics.arrays import FloatArray

__all__ = ["NO_SLOPE", "Residuals"]

HUGE = 1e100
"""In place of what is not finite: its square is finite, and no search goes there."""

NO_SLOPE = 1e99
"""A column of derivatives this long has no slope: the model is not finite on either side."""


def _tame(values: FloatArray) -> FloatArray:
    return np.nan_to_num(values, nan=HUGE, posinf=HUGE, neginf=-HUGE).clip(-HUGE, HUGE)


class Residuals:
    """The residual function in scaled parameters, with its derivatives and a count of calls."""

    def __init__(
        self,
        function: Callable[[FloatArray], FloatArray],
        slopes: Callable[[FloatArray], FloatArray] | None,
        *,
        scale: FloatArray,
        lower: FloatArray,
        upper: FloatArray,
    ) -> None:
        self.function, self.slopes = function, slopes
        self.scale, self.lower, self.upper = scale, lower / scale, upper / scale
        self.calls = 0
        self.last: tuple[bytes, FloatArray] = (b"", np.empty(0))

    @property
    def bounded(self) -> bool:
        """Whether any parameter has a bound."""
        return bool(np.isfinite(self.lower).any() or np.isfinite(self.upper).any())

    def __call__(self, point: FloatArray) -> FloatArray:
        """Return the weighted residuals."""
        key = point.tobytes()
        # The solver and the judgement ask for one point in turn.
        if self.last[0] == key:
            return self.last[1]
        self.calls += 1
        # A trial step may overflow an exponential; the solver sees a huge residual and steps back.
        with np.errstate(all="ignore"):
            values = np.asarray(self.function(point * self.scale), dtype=np.float64)
        if values.ndim != 1:
            raise ValueError(f"model: found {values.ndim} dimensions, expected one")
        self.last = key, values
        return values

    def tame(self, point: FloatArray) -> FloatArray:
        """Return residuals with what is not finite made very large."""
        return _tame(self(point))

    def jacobian(self, point: FloatArray) -> FloatArray:
        """Return the caller's derivatives, or central differences, one-sided where a bound is in the way."""
        if self.slopes is not None:
            self.calls += 1
            with np.errstate(all="ignore"):
                return _tame(np.asarray(self.slopes(point * self.scale), dtype=np.float64) * self.scale)
        columns = []
        for index, value in enumerate(point):
            # A value is counted in its parameter's own scale: a resonance frequency is many line widths, and a step of a part
            # of it would leap over the line.
            step = np.finfo(float).eps ** (1 / 3) * max(min(abs(value), 1.0), 1e-4)
            above, below = point.copy(), point.copy()
            above[index] = min(value + step, self.upper[index])
            below[index] = max(value - step, self.lower[index])
            columns.append(self._difference(above, below, point, index))
        return np.column_stack(columns)

    def _difference(self, above: FloatArray, below: FloatArray, point: FloatArray, index: int) -> FloatArray:
        up, down = self(above), self(below)
        # Beside the edge of a model's domain only one side tells its slope.
        if not np.isfinite(up).all():
            above, up = point, self(point)
        if not np.isfinite(down).all():
            below, down = point, self(point)
        width = above[index] - below[index]
        return _tame((up - down) / width) if width > 0 else np.full(up.shape, HUGE)

    def rescaled(self, point: FloatArray) -> tuple[Residuals, FloatArray]:
        """Return the same function with the sizes of the parameters at a point as their scale, and that point."""
        value = point * self.scale
        scale = np.where(np.abs(point) > 1e-8, np.abs(value), self.scale)
        other = Residuals(
            self.function,
            self.slopes,
            scale=scale,
            lower=self.lower * self.scale,
            upper=self.upper * self.scale,
        )
        other.calls = self.calls
        return other, value / scale
