"""The dynamic theory's curve of a film at 2,000 temperatures against one integration of differential equations a temperature.

The baseline shares nothing with the program: the flow equations in x and ln Y and the two parts of the bound pairs' integral
go through `scipy.integrate.solve_ivp` at a relative tolerance of 1e-10, by the method of eighth order, which is the quickest
of the solver's explicit ones at this accuracy. The flow is followed to l_D + 12, where what is left is below 1e-10.
"""

from __future__ import annotations

import math

import numpy as np
from scipy.integrate import solve_ivp

from archive.physics.film_dynamic import complex_stiffness, fixed_start
from tests.benchmarks.harness import Benchmark, Size, Work

__all__ = ["BENCHMARK"]

B, L, F, X0 = 5.5, 12.0, 1.0, -0.5
"""Constants of the reference table's trajectory with a fixed start."""


def _prepare(size: Size) -> Work:
    ratio = np.linspace(0.9, 1.1, 2000 if size != "small" else 12)

    def subject() -> np.ndarray:
        return complex_stiffness(fixed_start(ratio, b=B, x0=X0), L=L, F=F)

    def baseline() -> np.ndarray:
        return np.array([_integrated((B / 4) ** 2 * (each - 1)) for each in ratio])

    return Work(subject, baseline, ratio.size)


def _integrated(c: float) -> complex:
    l_D = (L + math.log(14)) / 2

    def slope(length: float, state: np.ndarray) -> list[float]:
        x, log_Y, _, _ = state
        Y2 = math.exp(2 * log_Y)
        z = math.exp(min(2 * (length - l_D), 300.0))
        return [2 * Y2, 2 * x / (1 + x), 2 * Y2 / (1 + z * z), 2 * Y2 * z / (1 + z * z)]

    def end(_length: float, state: np.ndarray) -> float:
        return state[0] - 1

    end.terminal = True
    begin = [X0, math.log(c + 2 * (X0 - math.log1p(X0))) / 2, 0.0, 0.0]
    solution = solve_ivp(slope, (0, l_D + 12), begin, method="DOP853", rtol=1e-10, atol=1e-13, events=end)
    real, imaginary = solution.y[2:, -1]
    free = math.exp(2 * (l_D - solution.t[-1])) if solution.status == 1 else 0.0
    return (2 / math.pi) / (1 + X0 + real + 1j * (imaginary + 4 * math.pi * F / 7 * free))


BENCHMARK = Benchmark(
    name="dynamic-curve",
    description="complex stiffness of a film at 2,000 temperatures from 0.9 to 1.1 of the transition, to 1e-8",
    subject="closed flow and quadrature, all temperatures at once",
    baseline="scipy.integrate.solve_ivp, DOP853, rtol 1e-10, once a temperature",
    unit="temperatures",
    prepare=_prepare,
    tolerance=1e-8,
)
