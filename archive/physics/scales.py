"""Conversion between the temperature scales of this trade.

Rules: a conversion is a new, derived value; it states its method and adds its uncertainty. Scales without a confirmed
conversion are recorded and refused, not guessed. Everything goes by way of ITS-90.

References
----------
The vapour pressure scales are converted at equal pressure to ITS-90, H. Preston-Thomas, Metrologia 27, 3 (1990). The
results agree with the open reference code for historical scales by A. H. Harvey (2026).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from archive.physics import tables_t58
from archive.physics.constants import MERCURY_MILLIMETRE
from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats, within
from archive.physics.vapour_pressure import Isotope, pressure_its90, temperature_its90

__all__ = ["SCALES", "Conversion", "Scale", "convert", "estimate_from_t58"]


class Conversion(NamedTuple):
    """Converted temperatures in K, the standard uncertainty the conversion adds in K, and a sentence on the method."""

    temperature: Floats
    uncertainty: Floats
    method: str


@dataclass(frozen=True)
class Scale:
    """A temperature scale with a confirmed conversion to ITS-90.

    Attributes
    ----------
    name, description : str
        The name as records write it, and what defines the scale.
    low, high : float
        Range of the conversion in K on the scale itself (not always that of the scale).
    """

    name: str
    description: str
    low: float
    high: float


SCALES: Final[tuple[Scale, ...]] = (
    Scale(
        "ITS-90",
        "International Temperature Scale of 1990; helium vapour pressure from 0.65 to 5 K",
        0.65,
        27.1,
    ),
    Scale(
        "PLTS-2000",
        "Provisional Low Temperature Scale of 2000: melting pressure of 3He, 0.902 mK to 1 K",
        0.6485,
        0.9972,
    ),
    Scale("EPT-76", "Provisional Temperature Scale of 1976, 0.5 to 30 K", 0.65001, 27.1),
    Scale(
        "T58",
        "1958 vapour pressure table of 4He (lambda point 2.1720 K, boiling point 4.2150 K)",
        1.247,
        4.9926,
    ),
    Scale("T62", "1962 vapour pressure equation of 3He, 0.2 to 3.324 K", 0.6472, 3.1936),
    Scale("PTB-2006", "vapour pressure equation of 3He that follows PLTS-2000, 0.65 to 3.2 K", 0.65, 3.1999),
)
"""Every scale this module converts, in the order in which they are offered."""

_WHY_NOT: Final[dict[str, str]] = {
    "T48": "no confirmed conversion of the 1948 table is known here",
    "L55": "no confirmed conversion of the 1955 Leiden table is known here",
    "55E": "no confirmed conversion of the 1955 equation is known here",
}


def _vapour(c: tuple[float, ...]) -> Callable[[Floats], tuple[Floats, Floats]]:
    """Return ln p and its slope for ln p = c0/T + c1 + c2 T + ... + c5 T^4 + c6 ln T."""

    def log_pressure(T: Floats) -> tuple[Floats, Floats]:
        value = c[0] / T + c[1] + T * (c[2] + T * (c[3] + T * (c[4] + T * c[5]))) + c[6] * np.log(T)
        slope = -c[0] / T**2 + c[2] + T * (2 * c[3] + T * (3 * c[4] + T * 4 * c[5])) + c[6] / T
        return value, slope

    return log_pressure


# "The 1962 He3 scale of temperatures, II", J. Res. NBS 68A, 559 (1964); the pressure in millimetres of mercury.
_t62 = _vapour((-2.49174, 4.80386, -0.286001, 0.198608, -0.0502237, 0.00505486, 2.24846))
# J. Engert, B. Fellmuth, K. Jousten, Metrologia 44, 40 (2007), equation 8; the pressure in pascals.
_ptb = _vapour((-2.49255841, 9.55598062, -0.10775789, 0.13899533, -0.03962933, 0.00432461, 2.16565173))

_t58_table = CubicSpline(
    tables_t58.T58_FIRST_K + tables_t58.STEP_K * np.arange(len(tables_t58.PRESSURE_MICROMETRE_MERCURY)),
    np.log(np.array(tables_t58.PRESSURE_MICROMETRE_MERCURY) * 1e-3),
)


def _t58(T: Floats) -> tuple[Floats, Floats]:
    """Return ln(p/mmHg) of the 1958 table and its slope."""
    return _t58_table(T), _t58_table(T, 1)


class _Route(NamedTuple):
    """How one scale reaches ITS-90 and back, the standard uncertainty in K as a function of T, and the words for it."""

    to_its90: Callable[[Floats], Floats]
    from_its90: Callable[[Floats], Floats]
    uncertainty: Callable[[Floats], Floats]
    words: str


def _equal_pressure(
    law: Callable[[Floats], tuple[Floats, Floats]],
    unit: float,
    isotope: Isotope,
    bracket: tuple[float, float],
    *,
    u: float,
    words: str,
) -> _Route:
    def forward(T: Floats) -> Floats:
        return temperature_its90(unit * np.exp(law(T)[0]), isotope)

    def back(T: Floats) -> Floats:
        wanted = np.log(pressure_its90(T, isotope) / unit)
        return monotonic_inverse(law, wanted, low=bracket[0], high=bracket[1])

    return _Route(forward, back, lambda T: np.full_like(T, u), words)


# R. L. Rusby, J. Chem. Thermodyn. 23, 1153 (1991): T90 - T76 = -0.0056 mK (T76/K)^2.
_EPT: Final = -5.6e-6


def _ept_back(T: Floats) -> Floats:
    # The root of _EPT x^2 + x - T = 0 that does not cancel.
    result: Floats = 2 * T / (1 + np.sqrt(1 + 4 * _EPT * T))
    return result


# C. Pan et al., Metrologia 58, 025005 (2021): T2000 in K, T90 - T2000 in mK, as measured.
_PAN: Final = np.array([
    (0.6479, 1.577), (0.7005, 1.245), (0.7515, 1.094), (0.7985, 1.026),
    (0.8507, 0.718), (0.8985, 0.706), (0.9489, 0.647), (0.9972, 0.281),
])  # fmt: skip


def _plts_forward(T: Floats) -> Floats:
    result: Floats = T + 1e-3 * np.interp(T, _PAN[:, 0], _PAN[:, 1])
    return result


def _plts_back(T: Floats) -> Floats:
    knots = _plts_forward(_PAN[:, 0])
    result: Floats = np.interp(T, knots, _PAN[:, 0])
    return result


_ROUTES: Final[dict[str, _Route]] = {
    "ITS-90": _Route(lambda T: T, lambda T: T, np.zeros_like, "ITS-90"),
    # 0.2 mK: the smoothness of the scales, and what the 3He and the 4He route differ by at 2 K.
    "T58": _equal_pressure(_t58, MERCURY_MILLIMETRE, "4He", (1.2, 5.22), u=0.2e-3,
                           words="equal vapour pressure of 4He, T58 table (cubic spline of ln p) and ITS-90"),
    "T62": _equal_pressure(_t62, MERCURY_MILLIMETRE, "3He", (0.6, 3.324), u=0.2e-3,
                           words="equal vapour pressure of 3He, T62 equation and ITS-90"),
    # Two defining equations: what is left is their rounding, checked to 2 uK.
    "PTB-2006": _equal_pressure(_ptb, 1.0, "3He", (0.6, 3.3), u=0.002e-3,
                                words="equal vapour pressure of 3He, PTB-2006 equation and ITS-90"),
    # The coefficient has two figures; half of its last digit as a rectangular distribution.
    "EPT-76": _Route(lambda T: T + _EPT * T**2, _ept_back, lambda T: 0.05e-6 / np.sqrt(3) * T**2,
                     "T90 - T76 = -0.0056 mK (T76/K)^2 (uncertainty: rounding of the coefficient)"),
    # 0.1 mK: scatter of the eight differences about a straight line (0.095 mK with six degrees of freedom).
    "PLTS-2000": _Route(_plts_forward, _plts_back, lambda T: np.full_like(T, 0.1e-3),
                        "linear interpolation of the eight measured differences T90 - T2000 of Pan et al. (2021)"),
}  # fmt: skip


def _scale(name: str, argument: str) -> Scale:
    for scale in SCALES:
        if scale.name == name:
            return scale
    known = ", ".join(scale.name for scale in SCALES)
    if name.startswith("local:"):
        why = "a laboratory scale has no conversion but its own calibration"
    else:
        why = _WHY_NOT.get(name, "this is no scale with a confirmed conversion")
    raise ValueError(
        f"{argument}: {name!r} cannot be converted: {why}. Keep the number on its own scale and do not mix it with others; "
        f"scales that can be converted: {known}"
    )


def _its90_span(scale: Scale) -> tuple[float, float]:
    route = _ROUTES[scale.name]
    return float(route.to_its90(floats(scale.low))), float(route.to_its90(floats(scale.high)))


def convert(temperature: ArrayLike, *, source: str, target: str = "ITS-90") -> Conversion:
    """Return temperatures of one scale expressed on another, the uncertainty that this adds, and the method in words.

    Parameters
    ----------
    temperature : float or array_like
        Temperatures in K on `source`. NaN gives NaN.
    source, target : str
        Names in `SCALES`.

    Returns
    -------
    Conversion
        `temperature` in K on `target`; `uncertainty`, standard, of the conversion alone (to be added to that of the
        temperatures; common to all values of one conversion); `method`, one sentence for records and reports.

    Raises
    ------
    ValueError
        When a scale has no confirmed conversion, or a temperature lies outside the range of either conversion. Nothing
        is extrapolated.

    Notes
    -----
    Ranges, in K on the scale itself: T58 1.247-4.9926, T62 0.6472-3.1936, EPT-76 0.65001-27.1, PTB-2006
    0.65-3.1999, PLTS-2000 0.6485-0.9972; the ends are where ITS-90, or the measured points, end. The T58 lambda point, 2.1720 K, becomes 2.17663 K and not 2.1768 K:
    the 0.17 mK are a property of T58. PLTS-2000 against ITS-90 is a measured difference, not a definition.

    References
    ----------
    See the module and the comments beside each coefficient.

    Examples
    --------
    >>> result = convert(4.215, source="T58")
    >>> round(float(result.temperature), 4), round(float(result.uncertainty), 5)
    (4.2221, 0.0002)
    """
    start, end = _scale(source, "source"), _scale(target, "target")
    T = within(temperature, "temperature", low=start.low, high=start.high, unit="K", formula=f"the conversion of {source}",
               hint="keep the number on its own scale")  # fmt: skip
    if start is end:
        return Conversion(T[()], np.zeros_like(T)[()], f"{source}: no conversion")
    first, second = _ROUTES[source], _ROUTES[target]
    T90 = floats(first.to_its90(T))
    low, high = _its90_span(end)
    # A nanokelvin for the rounding of the ends.
    within(T90, "temperature", low=low - 1e-9, high=high + 1e-9, unit="K on ITS-90", formula=f"the conversion to {target}",
           hint="keep the number on its own scale")  # fmt: skip
    result = floats(second.from_its90(np.clip(T90, low, high)))
    u = np.hypot(first.uncertainty(T), second.uncertainty(T90))
    words = [route.words for name, route in ((source, first), (target, second)) if name != "ITS-90"]
    return Conversion(result[()], u[()], f"{source} to {target}: {'; then '.join(words)}")


# A. H. Harvey's reference code treats T58 as T62 below this and keeps the last offset above the upper end.
_T58_LOW, _T58_HIGH = 1.247, 4.9926
_T58_FIRST, _T58_LAST = 0.6472, 5.22
_ESTIMATE_EXTRA: Final = 0.5e-3


def estimate_from_t58(temperature: ArrayLike) -> Conversion:
    """Return T90 from T58 outside the confirmed range, as a labelled estimate.

    Parameters
    ----------
    temperature : float or array_like
        T58 in K, 0.6472 to 1.247 K or 4.9926 to 5.22 K. NaN gives NaN.

    Returns
    -------
    Conversion
        As `convert`, with 0.5 mK added to the uncertainty and the word "estimate" in the method.

    Raises
    ------
    ValueError
        When a temperature is outside both ranges; inside 1.247 to 4.9926 K use `convert`.

    Notes
    -----
    Below 1.247 K T58 is taken as equal to T62, above 4.9926 K the offset at 4.9926 K is kept.
    """
    T = within(
        temperature, "temperature", low=_T58_FIRST, high=_T58_LAST, unit="K", formula="the T58 estimate"
    )
    inside = np.flatnonzero((T > _T58_LOW) & (T < _T58_HIGH))
    if inside.size:
        raise ValueError(
            f"temperature[{inside[0]}] = {T.ravel()[inside[0]]:.8g} K has a confirmed conversion: use convert(..., source='T58')"
        )
    result = np.full(T.shape, np.nan)
    cold, warm = T <= _T58_LOW, T >= _T58_HIGH
    result[cold] = convert(T[cold], source="T62").temperature
    result[warm] = T[warm] + (float(convert(_T58_HIGH, source="T58").temperature) - _T58_HIGH)
    u = np.full(T.shape, 0.2e-3 + _ESTIMATE_EXTRA)
    return Conversion(
        result[()],
        u[()],
        "T58 to ITS-90, estimate: T58 taken as T62 below 1.247 K, last offset kept above 4.9926 K",
    )
