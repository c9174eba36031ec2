"""Resonance in a frequency sweep of both lock-in components, or the plain statement that there is none.

Rules: X and Y are fitted together; a number is given only if the resonance is decisive against the background alone and lies
inside the sweep; the sign convention of the lock-in is an argument.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray, same_length, series
from archive.physics.fitting import FitResult, Parameter, fit_residuals
from archive.physics.linear_fit import linear_fit
from archive.physics.residual_tests import aicc, f_test, runs_test

__all__ = ["Resonance", "fit_resonance", "frequency_of_largest_response", "resonance_curve"]

Background = Literal["constant", "sloped"]
Convention = Literal["+", "-"]

DECISIVE_PROBABILITY = 1e-6
"""Chance of the gain by luck that still counts as decisive (common practice, no source)."""

DECISIVE_AICC = 20.0
"""Difference of the information criterion that counts as decisive; 10 is the usual word (common practice, no source)."""

AMPLITUDE_OVER_NOISE = 3.0
"""Least height of the resonance over the residual of one point (common practice, no source)."""

STRUCTURED_RESIDUAL = 0.1
"""Largest structured residual, in heights of the resonance, of a model that describes the record (no source)."""


@dataclass(frozen=True)
class Resonance:
    """Outcome of a search for one resonance in a sweep.

    Attributes
    ----------
    found : bool
        True only if the numbers below mean something.
    reason : str
        Why, in words.
    fit : FitResult or None
        Parameters frequency (Hz), quality_factor, height (A Q, unit of the data), phase (rad), background_x, background_y and
        for a sloped background slope_x, slope_y (per Hz, about the frequency). None if there was nothing to fit.
    frequency, quality_factor, width : float
        Resonance frequency in Hz, Q, and full width at half maximum f0/Q of the power in Hz; not a number unless found.
    frequency_at_maximum : float
        Grid frequency where ``|Z - background|`` is largest, Hz; not a number unless found.
    noise : float
        Standard deviation of the residual of one component, unit of the data.
    structured : bool
        The residual is not random: the background is not what was fitted, and the uncertainties are too small.
    probability : float
        Chance that the resonance's gain over the background alone is luck.
    aicc_gain : float
        By how much the information criterion falls with the resonance.
    background : str
        "constant" or "sloped", as fitted.
    convention : str
        Sign of i w t.
    """

    found: bool
    reason: str
    fit: FitResult | None
    frequency: float
    quality_factor: float
    width: float
    frequency_at_maximum: float
    noise: float
    structured: bool
    probability: float
    aicc_gain: float
    background: Background
    convention: Convention


def resonance_curve(
    frequency: npt.ArrayLike,
    *,
    resonance_frequency: float,
    quality_factor: float,
    height: float,
    phase: float,
    convention: Convention = "+",
) -> ComplexArray:
    """Return ``e^{i phi} A/(1 - r^2 + i r/Q)`` with ``A = height/Q``; its complex conjugate for exp(-i w t).

    Parameters
    ----------
    frequency : array_like
        Hz.
    resonance_frequency, quality_factor : float
        Hz, and Q.
    height : float
        Diameter of the circle, A Q.
    phase : float
        rad, of the transducer.
    convention : {"+", "-"}
        Sign of i w t in the lock-in; "+" is usual.
    """
    r = np.asarray(frequency, dtype=np.float64) / resonance_frequency
    curve = height / quality_factor * np.exp(1j * phase) / (1 - r * r + 1j * r / quality_factor)
    return np.asarray(curve if convention == "+" else np.conj(curve), dtype=np.complex128)


def fit_resonance(
    frequency: npt.ArrayLike,
    x: npt.ArrayLike,
    y: npt.ArrayLike,
    *,
    background: Background = "constant",
    convention: Convention = "+",
    standard_uncertainty: npt.ArrayLike | None = None,
    near: tuple[float, float] | None = None,
    over_noise: float = AMPLITUDE_OVER_NOISE,
    ending: npt.ArrayLike | None = None,
    max_evaluations: int = 3000,
) -> Resonance:
    """Return the one resonance of a sweep, or that there is none in range.

    Parameters
    ----------
    frequency : array_like
        Hz, > 0, any order, at least twelve points.
    x, y : array_like
        Lock-in components, one unit.
    background : {"constant", "sloped"}
        What the resonance stands on.
    convention : {"+", "-"}
        Sign of i w t in the lock-in.
    standard_uncertainty : array_like, optional
        Of each point, for x and y alike; relative weights, the covariance is scaled by chi2/dof.
    near : tuple of float, optional
        Frequency and full width, Hz, > 0, to begin with where they are known roughly; other starts are then tried only if this
        one does not converge.
    over_noise : float
        Least height over the residual of one point; zero where many points make up for it, as in a filtered spectrum.
    ending : array_like of complex, optional
        One over the spectrum of the drive at each frequency, where a record may end before the resonator has come to rest: a part
        proportional to it is fitted, too, as ``ending_x`` and ``ending_y`` (see Notes).
    max_evaluations : int
        Evaluations of the curve from one start, after which a fit has not converged.

    Returns
    -------
    Resonance

    Raises
    ------
    ValueError
        Bad arrays, or an unknown word.

    Notes
    -----
    No resonance in range: the fit did not converge, the frequency is at or over an edge, the width exceeds the range, the
    height is below three times (`over_noise`) the residual of one point, a structured residual exceeds a tenth of the height (try a sloped
    background), or the gain over the background alone is not decisive (F-test and information criterion). Start: circle fit; the resonance frequency is taken opposite the off-resonance point.

    A record that is cut while the resonator rings lacks the free decay from there on. At the frequencies of the record's own Fourier
    series that decay is the same curve once more, with an amplitude and phase of its own, and without the drive's spectrum (the
    transform of a decay that begins where the record ends, derived); over the drive's spectrum it is no smooth background.
    """
    f = series("frequency", frequency, least=12, positive=True)
    z = series("x", x) + 1j * series("y", y)
    same_length(frequency=f, x=z.real, y=z.imag)
    if background not in {"constant", "sloped"}:
        raise ValueError(f"background: found {background!r}, expected 'constant' or 'sloped'")
    if convention not in {"+", "-"}:
        raise ValueError(f"convention: found {convention!r}, expected '+' or '-'")
    spread = (
        np.ones_like(f) if standard_uncertainty is None else np.broadcast_to(standard_uncertainty, f.shape)
    )
    weights = 1 / series("standard_uncertainty", spread, positive=True)
    order = np.argsort(f, kind="stable")
    turn = np.asarray if convention == "+" else np.conj
    after = None if ending is None else turn(np.asarray(ending, dtype=np.complex128)[order])
    sweep = _Sweep(f[order], turn(z[order]), weights[order], background, after)
    alone = sweep.background_sum()
    rounding = (1e-13 * float(np.max(np.abs(z) * weights))) ** 2 * f.size
    if alone <= rounding or float(np.ptp(f)) == 0:
        return _none("no resonance in range: the record does not change", None, sweep, convention)
    known = None if near is None else sweep.fit(sweep.start_near(*near), max_evaluations)
    if known is None or not known.converged:
        known = min(
            (sweep.fit(start, max_evaluations) for start in sweep.starts()),
            key=lambda result: (not result.converged, result.chi2),
        )
    return _judged(known, sweep, alone=alone, convention=convention, over_noise=over_noise)


def frequency_of_largest_response(
    frequency: npt.ArrayLike, x: npt.ArrayLike, y: npt.ArrayLike, *, background: complex | None = None
) -> float:
    """Return the grid frequency where ``|Z - background|`` is largest, or not a number if that is at an end of the sweep.

    Parameters
    ----------
    frequency : array_like
        Hz.
    x, y : array_like
        Lock-in components.
    background : complex, optional
        X + iY far from resonance, in the same unit; by default the medians of x and y.

    Notes
    -----
    A rough reading, wrong by about background over height in widths. A maximum within 2 per cent of an end says only that this
    constant is not the background: it does not say that there is no resonance, which is what `fit_resonance` is for.
    """
    f = series("frequency", frequency, least=3)
    z = series("x", x) + 1j * series("y", y)
    same_length(frequency=f, x=z.real, y=z.imag)
    level = complex(np.median(z.real), np.median(z.imag)) if background is None else background
    largest = float(f[int(np.argmax(np.abs(z - level)))])
    low, high = float(f.min()), float(f.max())
    return math.nan if min(largest - low, high - largest) < 0.02 * (high - low) else largest


@dataclass(frozen=True)
class _Sweep:
    """A sweep in rising frequency, in the exp(+i w t) convention."""

    frequency: FloatArray
    z: ComplexArray
    weights: FloatArray
    background: Background
    ending: ComplexArray | None = None

    def background_sum(self) -> float:
        """Return the weighted sum of squares of the best background without a resonance."""
        centred = self.frequency - self.frequency.mean()
        columns = [np.ones_like(centred)] + ([centred] if self.background == "sloped" else [])
        names = ("level", "slope")[: len(columns)]
        parts = (self.z.real, self.z.imag)
        design = np.column_stack(columns)
        u = 1 / self.weights
        return sum(
            linear_fit(design, part, names=names, standard_uncertainty=u, absolute=False).chi2
            for part in parts
        )

    def start_near(self, f0: float, width: float) -> tuple[float, float, float, float, complex]:
        """Return start values for a known frequency and width; height, phase and background by linear least squares."""
        if not (f0 > 0 and width > 0):
            raise ValueError(f"near: found {f0:.6g} Hz and {width:.6g} Hz, expected two numbers > 0")
        unit = resonance_curve(
            self.frequency, resonance_frequency=f0, quality_factor=f0 / width, height=1.0, phase=0.0
        )
        design = np.column_stack([unit, np.ones_like(unit)]) * self.weights[:, np.newaxis]
        solution, *_ = np.linalg.lstsq(design, self.z * self.weights, rcond=None)
        height, off = complex(solution[0]), complex(solution[1])
        return f0, f0 / width, abs(height), float(np.angle(height)), off

    def starts(self) -> list[tuple[float, float, float, float, complex]]:
        """Return start values (frequency, Q, height, phase, background)."""
        f, z = self.frequency, self.z
        span = float(f[-1] - f[0])
        edge = max(f.size // 20, 2)
        off = complex((z[:edge].mean() + z[-edge:].mean()) / 2)
        centre, radius = _circle(z)
        opposite = 2 * centre - off
        candidates = [int(np.argmin(np.abs(z - opposite))), int(np.argmax(np.abs(_smoothed(z - off))))]
        found = []
        for index in dict.fromkeys(candidates):
            size = float(np.abs(_smoothed(z - off))[index]) or radius
            # Where the distance from the background exceeds half its maximum the width is sqrt(3) f0/Q.
            inside = np.abs(_smoothed(z - off)) > size / 2
            wide = float(np.count_nonzero(inside)) / f.size * span / math.sqrt(3)
            for width in (max(wide, 2 * span / f.size), span / 10):
                # On resonance the curve is height e^{i phi}/i.
                phase = float(np.angle((z[index] - off) * 1j))
                found.append((float(f[index]), float(f[index]) / width, size, phase, off))
        return found

    def fit(self, start: tuple[float, float, float, float, complex], max_evaluations: int) -> FitResult:
        """Return the fit of resonance and background from one start."""
        f0, q, height, phase, off = start
        f, z = self.frequency, self.z
        span = float(f[-1] - f[0])
        size = float(np.max(np.abs(z - z.mean())))
        # One span beyond each edge: further out there is nothing to tell a resonance from a background.
        low, high = max(float(f[0]) - span, 1e-3 * float(f[0])), float(f[-1]) + span
        # The cosine and sine parts of the height have no wrap-around, unlike height and phase.
        parameters = [
            Parameter("frequency", f0, low, high, scale=f0 / q),
            Parameter("log_quality_factor", math.log(q), math.log(1e-2), math.log(1e12), scale=1.0),
            Parameter("in_phase", height * math.cos(phase), scale=size),
            Parameter("quadrature", height * math.sin(phase), scale=size),
            Parameter("background_x", off.real, scale=size),
            Parameter("background_y", off.imag, scale=size),
        ]
        if self.background == "sloped":
            parameters += [Parameter(name, 0.0, scale=size / span) for name in ("slope_x", "slope_y")]
        if self.ending is not None:
            usual = size / float(np.median(np.abs(self.ending)))
            parameters += [Parameter(name, 0.0, scale=usual) for name in ("ending_x", "ending_y")]

        def residuals(p: FloatArray) -> FloatArray:
            difference = (z - self.curve(p)) * self.weights
            return np.concatenate([difference.real, difference.imag])

        return fit_residuals(residuals, parameters, absolute=False, max_evaluations=max_evaluations)

    def resonance(self, p: FloatArray) -> ComplexArray:
        """Return the resonant part at the fit's own parameters."""
        size, phase = math.hypot(p[2], p[3]), math.atan2(p[3], p[2])
        q = math.exp(p[1])
        return resonance_curve(
            self.frequency, resonance_frequency=p[0], quality_factor=q, height=size, phase=phase
        )

    def curve(self, p: FloatArray) -> ComplexArray:
        """Return resonance and background."""
        total = self.resonance(p) + (p[4] + 1j * p[5])
        if self.background == "sloped":
            total = total + (p[6] + 1j * p[7]) * (self.frequency - p[0])
        if self.ending is not None:
            alone = resonance_curve(
                self.frequency,
                resonance_frequency=p[0],
                quality_factor=math.exp(p[1]),
                height=1.0,
                phase=0.0,
            )
            total = total + (p[-2] + 1j * p[-1]) * alone * self.ending
        return np.asarray(total, dtype=np.complex128)


def _circle(z: ComplexArray) -> tuple[complex, float]:
    """Return centre and radius of the algebraic least-squares circle through points of the plane."""
    size = float(np.max(np.abs(z - z.mean()))) or 1.0
    w = (z - z.mean()) / size
    matrix = np.column_stack([w.real, w.imag, np.ones(w.size)])
    solution, *_ = np.linalg.lstsq(matrix, np.abs(w) ** 2, rcond=None)
    centre = complex(solution[0], solution[1]) / 2
    radius = math.sqrt(max(float(solution[2]) + abs(centre) ** 2, 0.0))
    return complex(z.mean()) + size * centre, size * radius


def _smoothed(z: ComplexArray) -> ComplexArray:
    """Return a running median over five points of both parts: one wild point is not a resonance."""
    padded = np.concatenate([z[:2][::-1], z, z[-2:][::-1]])
    windows = np.lib.stride_tricks.sliding_window_view(padded, 5)
    return np.asarray(
        np.median(windows.real, axis=1) + 1j * np.median(windows.imag, axis=1), dtype=np.complex128
    )


def _none(
    reason: str, found: FitResult | None, sweep: _Sweep, convention: Convention, **numbers: float
) -> Resonance:
    nan = math.nan
    return Resonance(
        found=False,
        reason=reason,
        fit=found,
        frequency=nan,
        quality_factor=nan,
        width=nan,
        frequency_at_maximum=nan,
        noise=numbers.get("noise", 0.0),
        structured=bool(numbers.get("structured", False)),
        probability=numbers.get("probability", 1.0),
        aicc_gain=numbers.get("aicc_gain", 0.0),
        background=sweep.background,
        convention=convention,
    )


def _judged(
    raw: FitResult, sweep: _Sweep, *, alone: float, convention: Convention, over_noise: float
) -> Resonance:
    points = 2 * sweep.frequency.size
    full, plain = raw.values.size, 4 if sweep.background == "sloped" else 2
    probability = f_test(
        chi2_simple=alone, dof_simple=points - plain, chi2_full=raw.chi2, dof_full=points - full
    )
    gain = aicc(residual_sum=alone, points=points, parameters=plain) - aicc(
        residual_sum=raw.chi2, points=points, parameters=full
    )
    residual = sweep.z - sweep.curve(raw.values)
    noise = math.sqrt(float(np.mean(np.abs(residual) ** 2)) / 2)
    chances = [runs_test(part).probability for part in (residual.real, residual.imag)]
    structured = min(chances) < DECISIVE_PROBABILITY
    numbers = {"noise": noise, "probability": probability, "aicc_gain": gain}
    fitted = _turned(raw)
    reason = _refusal(raw, sweep, structured=structured, over_noise=over_noise, **numbers)
    if reason:
        return _none(
            f"no resonance in range: {reason}", fitted, sweep, convention, structured=structured, **numbers
        )
    f0, q = fitted.value("frequency"), fitted.value("quality_factor")
    distance = np.abs(sweep.z - (sweep.curve(raw.values) - sweep.resonance(raw.values)))
    return Resonance(
        found=True,
        reason="resonance found",
        fit=fitted,
        frequency=f0,
        quality_factor=q,
        width=f0 / q,
        frequency_at_maximum=float(sweep.frequency[int(np.argmax(distance))]),
        structured=structured,
        background=sweep.background,
        convention=convention,
        **numbers,
    )


def _refusal(
    raw: FitResult,
    sweep: _Sweep,
    *,
    structured: bool,
    over_noise: float,
    noise: float,
    probability: float,
    aicc_gain: float,
) -> str:
    """Return why the numbers of a fit mean nothing, or an empty text."""
    f, f0 = sweep.frequency, float(raw.values[0])
    width = f0 / math.exp(raw.values[1])
    height = math.hypot(raw.values[2], raw.values[3])
    checks = (
        (
            probability > DECISIVE_PROBABILITY or aicc_gain < DECISIVE_AICC,
            "the background alone describes the record",
        ),
        (
            not f[0] < f0 < f[-1],
            f"the fitted frequency {f0:.6g} Hz is not inside {f[0]:.6g} to {f[-1]:.6g} Hz",
        ),
        (width > f[-1] - f[0], f"the fitted width {width:.4g} Hz exceeds the range of the sweep"),
        (
            min(f0 - f[0], f[-1] - f0) < width / 2,
            f"the fitted frequency {f0:.6g} Hz is within half a width of the edge of the sweep",
        ),
        (height < over_noise * noise, "the resonance is not above the noise"),
        (
            structured and noise > STRUCTURED_RESIDUAL * height,
            f"resonance and {sweep.background} background do not describe the record",
        ),
        (np.count_nonzero(np.abs(f - f0) <= width) < 3, "fewer than three points lie on the resonance"),
        (not raw.converged, f"the fit is {raw.message}"),
    )
    return next((text for failed, text in checks if failed), "")


def _turned(raw: FitResult) -> FitResult:
    """Return the fit in frequency, quality factor, height and phase instead of the parameters it was searched in."""
    names = ("frequency", "quality_factor", "height", "phase", *raw.names[4:])
    values = raw.values.copy()
    p, q = values[2], values[3]
    height = math.hypot(p, q)
    values[1:4] = math.exp(values[1]), height, math.atan2(q, p)
    jacobian = np.eye(values.size)
    jacobian[1, 1] = values[1]
    if height > 0:
        jacobian[2:4, 2:4] = [[p / height, q / height], [-q / height**2, p / height**2]]
    finite = np.isfinite(raw.covariance).all()
    covariance = jacobian @ raw.covariance @ jacobian.T if finite else raw.covariance
    return FitResult(**{**vars(raw), "names": names, "values": values, "covariance": covariance})
