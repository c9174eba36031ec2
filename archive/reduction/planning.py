"""Plans: those that Stillroom ships, reading one, and which of them serve a sweep."""

from __future__ import annotations

import json
from collections.abc import Iterable
from functools import cache
from importlib import resources

from pydantic import ValidationError

from archive.errors import InvalidSheet
from schemas.lineage import AnyRecord, SweepEntry
from schemas.plan import Applies, Plan
from schemas.substrate import Substrate
from schemas.sweep import Sweep
from schemas.toml_text import TomlFault, tables_of

__all__ = ["applies", "load_plan", "plan_depth", "plans_for", "shipped_plans"]


@cache
def shipped_plans() -> tuple[Plan, ...]:
    """Return the plans that Stillroom ships, sorted by name."""
    folder = resources.files("archive.reduction") / "plans"
    files = sorted(
        (entry for entry in folder.iterdir() if entry.name.endswith(".toml")), key=lambda entry: entry.name
    )
    return tuple(load_plan(entry.read_text(encoding="utf-8"), file=entry.name) for entry in files)


def load_plan(text: str, *, file: str | None = None) -> Plan:
    """Return the plan that a TOML text holds.

    Parameters
    ----------
    text : str
        TOML.
    file : str, optional
        Name for messages.

    Raises
    ------
    InvalidSheet
        The text is no TOML or no plan; the first fault is named with its place.
    """
    try:
        return Plan.model_validate_json(json.dumps(tables_of(text), default=str))
    except TomlFault as fault:
        raise InvalidSheet(
            f"the plan is no valid TOML: {fault}", file=file, line=fault.line, column=fault.column
        ) from None
    except RecursionError:
        raise InvalidSheet("the plan is nested too deeply", file=file) from None
    except ValidationError as error:
        faults = error.errors()
        place = ".".join(str(part) for part in faults[0]["loc"])
        more = f" ({len(faults) - 1} more)" if len(faults) > 1 else ""
        raise InvalidSheet(
            f"the plan is not as plans are: {faults[0]['msg']}{more}", file=file, field=place or None,
            remedy="correct it; the shipped plans show the form",
        ) from None  # fmt: skip


def applies(
    plan: Plan, sweep: Sweep | SweepEntry, cell: AnyRecord | None = None, substrate: AnyRecord | None = None
) -> bool:
    """Return whether a plan is for a sweep; what is not told is not held against it."""
    terms = plan.applies
    if sweep.kind not in terms.sweep_kinds or terms.empty_cell not in (None, sweep.empty_cell):
        return False
    dosed = terms.doses in (None, bool(sweep.doses))
    if cell is not None and terms.cell_kinds and getattr(cell, "kind", None) not in terms.cell_kinds:
        return False
    if isinstance(sweep, Sweep) and not _as_written(terms, sweep):
        return False
    if (
        terms.has_substrate is not None
        and cell is not None
        and _coated(cell, substrate) != terms.has_substrate
    ):
        return False
    if terms.has_pores is not None and isinstance(substrate, Substrate):
        return dosed and (substrate.pore_diameter is not None) == terms.has_pores
    return dosed


def _as_written(terms: Applies, sweep: Sweep) -> bool:
    """Whether what only the sheet says of a sweep fits: its gas, and a channel under calibration."""
    return terms.gas in (None, sweep.gas) and terms.calibrates in (None, sweep.calibrates is not None)


def _coated(cell: AnyRecord, substrate: AnyRecord | None) -> bool:
    """Whether a substrate is recorded: a film is measured, not bulk liquid."""
    return substrate is not None or getattr(cell, "substrate", None) is not None


def plans_for(
    sweep: Sweep, cell: AnyRecord | None, substrate: AnyRecord | None, plans: Iterable[Plan] | None = None
) -> list[Plan]:
    """Return the plans that serve a sweep, those that others need first.

    Parameters
    ----------
    sweep : Sweep
    cell, substrate : record or None
        Those of the sweep. A film on a torsional oscillator needs its cell; without it no plan of cells is offered.
    plans : iterable of Plan, optional
        The archive's own; by default the shipped ones.
    """
    known = tuple(shipped_plans() if plans is None else plans)
    fitting = [
        plan
        for plan in known
        if applies(plan, sweep, cell, substrate) and not (cell is None and plan.applies.cell_kinds)
    ]
    return sorted(fitting, key=lambda plan: (plan_depth(plan, known), plan.name))


def plan_depth(plan: Plan, known: Iterable[Plan]) -> int:
    """Return how many plans, this one included, must have been carried out one after the other; needs come first."""
    return _depth(plan, {each.name: each for each in known}, frozenset())


def _depth(plan: Plan, known: dict[str, Plan], seen: frozenset[str]) -> int:
    below = [known[need.plan] for need in plan.needs.values() if need.plan in known and need.plan not in seen]
    return 1 + max((_depth(each, known, seen | {plan.name}) for each in below), default=0)
