"""What a reduction's repetition with drawn inputs found: counts, coverage intervals, and the verdict on first order."""

from __future__ import annotations

from typing import Literal

from pydantic import Field

from schemas.base import Record

__all__ = ["MonteCarlo", "MonteCarloResult"]

Interval = tuple[float, float]


class MonteCarloResult(Record):
    """Drawn values of one scalar result, in the unit of the result."""

    name: str
    values: int = Field(ge=0, description="Trials that gave a number.")
    mean: float | None = None
    uncertainty: float | None = Field(default=None, description="Standard deviation of the drawn values.")
    symmetric: Interval | None = Field(
        default=None, description="Probabilistically symmetric coverage interval."
    )
    shortest: Interval | None = Field(default=None, description="Shortest coverage interval.")
    first_order: Interval | None = Field(
        default=None, description="Coverage interval of first order, a normal distribution about the value."
    )
    tolerance: float | None = Field(
        default=None, description="Half a unit of the last digit kept of the uncertainty."
    )
    difference: float | None = Field(
        default=None,
        description="Larger distance between the ends of the symmetric interval and of first order.",
    )
    numerical_uncertainty: float | None = Field(
        default=None,
        description="Standard uncertainty of that distance for the number of trials; none: too few.",
    )
    agreement: Literal["agrees", "differs", "undecided"] | None = Field(
        default=None,
        description="Whether first order holds to the digits kept; undecided: too few trials to tell.",
    )


class MonteCarlo(Record):
    """One repetition of a plan with drawn inputs."""

    trials: int = Field(ge=2)
    seed: int = Field(ge=0)
    generator: str = Field(description="Bit generator and how each trial is seeded.")
    adaptive: bool = Field(default=False, description="Whether the number of trials was found on the way.")
    probability: float = Field(gt=0, lt=1, description="Of the coverage intervals.")
    digits: int = Field(
        ge=1, le=2, description="Significant digits of the uncertainty that first order is held to."
    )
    failed: int = Field(ge=0, description="Trials in which a step gave no result.")
    failures: dict[str, int] = Field(
        default_factory=dict, description="Those trials by the step that failed first."
    )
    reasons: dict[str, str] = Field(
        default_factory=dict, description="What each of these steps said when it failed first."
    )
    beyond_noise: dict[str, float] = Field(
        default_factory=dict,
        description="Steps that see more scatter than their inputs state: share of their own variance drawn besides.",
    )
    results: tuple[MonteCarloResult, ...]
