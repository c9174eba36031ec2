"""Plans: an ordered list of reduction steps with their parameters, as data.

What a step takes is written as a small text:

| text | meaning |
|---|---|
| `channel:NAME` | channel of the sweep, in SI units, with its standard uncertainty |
| `channel:@thermometer` | the channel whose temperature counts |
| `channel:@KIND` | the only channel of a quantity kind, e.g. `channel:@period` |
| `sheet:NAME` | a value that the sheet or the records give for this sweep, e.g. `sheet:coverage`, `sheet:cell.gap` |
| `need:NAME#OUTPUT` | an output of another reduction, named in `needs`; of many, as one column |
| `channel:@calibrates` | the channel of the thermometer under calibration |
| `calibration:@thermometer` | the calibration in force for the counting thermometer |
| `thermometer:@thermometer.FIELD` | the record of the counting thermometer, if it states that field |
| anything else | an output of an earlier step of this plan |

Alternatives are parted by ` | `; the first that exists is taken.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, StringConstraints, model_validator

from schemas.base import Name, NamedRecord, Record, Text
from schemas.sweep import SweepKind

__all__ = ["Applies", "Need", "Plan", "PlanStep"]

_Key = Annotated[str, StringConstraints(pattern=r"^[A-Za-z][A-Za-z0-9_]{0,63}$")]
_ONE = r"[A-Za-z][A-Za-z0-9_]*(:[@A-Za-z0-9_.-]+(#[A-Za-z0-9_.]+)?)?"
_Source = Annotated[str, StringConstraints(pattern=rf"^{_ONE}( \| {_ONE})*$", max_length=400)]


class Applies(Record):
    """Which sweeps a plan is for."""

    sweep_kinds: tuple[SweepKind, ...] = Field(min_length=1)
    cell_kinds: tuple[str, ...] = Field(
        default=(), description="Kinds of cell; empty: any, or none recorded."
    )
    empty_cell: bool | None = Field(default=None, description="Only runs of the empty cell, or only others.")
    gas: Literal["helium", "adsorptive"] | None = None
    has_pores: bool | None = Field(
        default=None, description="Only substrates with, or without, a recorded pore size."
    )
    has_substrate: bool | None = Field(
        default=None, description="Only cells with, or without, a recorded substrate: films, or bulk liquid."
    )
    doses: bool | None = Field(
        default=None, description="Only sweeps during which doses were admitted, or only others."
    )
    calibrates: bool | None = Field(
        default=None, description="Only sweeps that name the channel under calibration, or only others."
    )
    last: bool = Field(
        default=False,
        description="True: it sums up a cell's sweeps in a cooldown, so it is carried out once, on the last that the other terms admit; on another one when that is named.",
    )
    least: int = Field(
        default=1, ge=1, description="With `last`: how many such sweeps of the cell the cooldown must have."
    )


class Need(Record):
    """Another reduction that this plan rests on: the newest one of that plan on a sweep related to this one.

    With `many` these are the newest ones on all related sweeps of this cooldown and, if the relation reaches further, of
    earlier ones. What is taken from them is one column with a row for each reduction, in the order of cooldowns and
    sweeps; a reduction that lacks an output has no value in its row.
    """

    plan: Name
    relation: Literal[
        "same-cell",
        "same-sweep",
        "same-dose",
        "same-cell-any-cooldown",
        "same-sample-any-cooldown",
        "same-liquid-any-cooldown",
    ] = Field(
        default="same-cell",
        description="`same-dose`: same cell and cooldown, after the same dose, so at the same filling. `same-liquid-any-cooldown`: same gas, as bulk liquid at the same pressure.",
    )
    many: bool = Field(default=False, description="True: every related sweep's, taken together.")
    optional: bool = Field(default=False, description="True: without it, inputs that name it do not exist.")


class PlanStep(Record):
    """One step: which, from what, with which parameters, giving what."""

    use: Name = Field(description="Name of the step.")
    version: int | None = Field(default=None, ge=1, description="Version of the step; left out: the newest.")
    take: dict[_Key, _Source] = Field(default_factory=dict)
    set: dict[_Key, bool | int | float | str | tuple[float, ...] | tuple[str, ...]] = Field(
        default_factory=dict
    )
    give: dict[_Key, _Key] = Field(
        default_factory=dict, description="Output of the step: its name in this plan."
    )
    optional: bool = Field(
        default=False, description="True: left out, and recorded as left out, when an input does not exist."
    )


class Plan(NamedRecord):
    """A plan, named and versioned."""

    title: Text
    applies: Applies
    needs: dict[_Key, Need] = Field(default_factory=dict)
    step: tuple[PlanStep, ...] = Field(min_length=1)
    headline: tuple[_Key, ...] = Field(
        default=(), description="Results to show first, at most three.", max_length=3
    )

    @model_validator(mode="after")
    def _names_once(self) -> Plan:
        seen: set[str] = set()
        for number, step in enumerate(self.step, 1):
            for source in (one for text in step.take.values() for one in text.split(" | ")):
                if ":" not in source and source not in seen:
                    raise ValueError(
                        f"step {number} ({step.use}) takes {source!r}, which no earlier step gives"
                    )
                if source.startswith("need:") and source[5:].partition("#")[0] not in self.needs:
                    raise ValueError(
                        f"step {number} ({step.use}) takes {source!r}, which `needs` does not name"
                    )
            for output in step.give.values():
                if output in seen:
                    raise ValueError(
                        f"step {number} ({step.use}) gives {output!r}, which an earlier step already gives"
                    )
                seen.add(output)
        return self
