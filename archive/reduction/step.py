"""What a reduction step declares, and what its function returns.

A step is a pure function: ``function(parameters, **inputs) -> Outcome``. Inputs are SI floats and arrays (records for
record ports), None for an optional one that does not exist. Nothing registers itself; `steps` holds the literal list.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from archive.reduction.estimate import Estimate, FloatArray
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["Covariance", "Given", "NoParameters", "Outcome", "Port", "Step"]

Form = Literal["array", "scalar", "number", "record"]
"""`number` takes a scalar or an array."""


class NoParameters(Record):
    """A step that has nothing to set."""


@dataclass(frozen=True)
class Port:
    """One input or output of a step.

    Parameters
    ----------
    quantity : str
        Quantity kind; ``any`` takes every kind; as an output ``same:PORT`` repeats the kind of an
        input, and ``area-of:PORT`` is an area for an amount and a specific area for an amount per mass.
    form : str
        ``array``, ``scalar``, ``number`` (either of both) or ``record``.
    description : str
        What it is, in a line.
    optional : bool
        Whether an input may be missing.
    """

    quantity: str
    form: Form
    description: str
    optional: bool = False


@dataclass(frozen=True)
class Given:
    """One input of a step, resolved.

    Attributes
    ----------
    address : str
        Where it stands.
    estimate : Estimate or None
    record : object or None
        For record ports.
    digest : str or None
    """

    address: str
    estimate: Estimate | None = None
    record: object | None = None
    digest: str | None = None


@dataclass(frozen=True)
class Covariance:
    """Covariance of fitted outputs.

    Parameters
    ----------
    names : tuple of str
        Output names; ``name[3]`` is an element of an array output.
    matrix : ndarray
        In SI units of the outputs.
    """

    names: tuple[str, ...]
    matrix: FloatArray


@dataclass(frozen=True)
class Outcome:
    """What a step's function returns.

    Parameters
    ----------
    outputs : mapping
        Output name to float or array, SI; NaN where there is no value.
    point : mapping
        Point uncertainty of outputs, for steps with ``spread="refit"``.
    shared : mapping
        Per output: contributions of sources that arise in this step.
    sources : tuple of SourceEntry
        Those sources.
    covariance : Covariance, optional
        Of fitted outputs.
    held : mapping
        Choices made from the data (an order, a break, a window) that must not change while inputs are shifted.
    scales : mapping
        Temperature scale of outputs, when not that of the inputs.
    facts, findings, verdicts
        What else there is to say; a verdict is a word instead of a number.
    citations : tuple of str, optional
        Those of the step's citations that bear on what was done this time; all of them if nothing is said.
    """

    outputs: Mapping[str, float | FloatArray]
    point: Mapping[str, npt.ArrayLike] = field(default_factory=dict)
    shared: Mapping[str, Mapping[str, npt.ArrayLike]] = field(default_factory=dict)
    sources: tuple[SourceEntry, ...] = ()
    covariance: Covariance | None = None
    held: Mapping[str, Any] = field(default_factory=dict)
    scales: Mapping[str, str] = field(default_factory=dict)
    facts: Mapping[str, Any] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    verdicts: Mapping[str, str] = field(default_factory=dict)
    citations: tuple[str, ...] | None = None

    def array(self, name: str) -> FloatArray:
        """Return an output as an array of 0 or 1 dimensions."""
        return np.asarray(self.outputs[name], dtype=np.float64)


@dataclass(frozen=True)
class Step:
    """One versioned operation of data reduction.

    Parameters
    ----------
    name, version : str, int
        A name is never reused; the version rises when any number may change.
    function : callable
        ``function(parameters, **inputs) -> Outcome``.
    takes, yields : mapping of str to Port
    sentence : str
        For the methods appendix; ``{name}`` is a parameter, a fact, or an input or output with unit and uncertainty.
    parameters : type of Record
        Model of what can be set.
    citations : tuple of str
        Keys of the bibliography.
    effects : mapping of str to str
        Known effects that the step treats, each with its sentence.
    considered : mapping of str to str
        Known effects that the step only looks for, and corrects nothing, each with its sentence.
    spread : str
        ``elementwise``: element i of an output depends on element i of the inputs alone, so the runner finds point
        uncertainties by shifting; ``refit``: the function takes them as weights and answers for them.
    weights : tuple of str
        Array inputs whose point uncertainty is handed over as ``u_NAME``.
    kinds : tuple of str
        Inputs whose quantity kind is handed over as ``NAME_kind``.
    scales : tuple of str
        Temperature inputs whose scale is handed over as ``NAME_scale``.
    estimates : tuple of str
        Inputs whose estimate is handed over as ``NAME_estimate``, unshifted: for a fit that weighs with what its rows share.
    one_of : tuple of str
        Optional inputs of which one at least must exist; without any the step lacks an input.
    """

    name: str
    version: int
    function: Callable[..., Outcome]
    takes: Mapping[str, Port]
    yields: Mapping[str, Port]
    sentence: str
    parameters: type[Record] = NoParameters
    citations: tuple[str, ...] = ()
    effects: Mapping[str, str] = field(default_factory=dict)
    considered: Mapping[str, str] = field(default_factory=dict)
    spread: Literal["elementwise", "refit"] = "elementwise"
    weights: tuple[str, ...] = ()
    kinds: tuple[str, ...] = ()
    scales: tuple[str, ...] = ()
    estimates: tuple[str, ...] = ()
    one_of: tuple[str, ...] = ()
