"""Plans that a laboratory's own package brings, beside those that Stillroom ships.

Rules: they come by the entry point group `stillroom.plans`, here and nowhere else; each entry names a Python package that
holds plan files. The name of a shipped plan is taken.
"""

from __future__ import annotations

from functools import cache
from importlib import resources
from importlib.metadata import EntryPoint, entry_points
from types import ModuleType

from archive.errors import BadRequest
from archive.reduction.planning import load_plan, shipped_plans
from schemas.plan import Plan

__all__ = ["added_plans"]


@cache
def added_plans() -> tuple[Plan, ...]:
    """Return the plans of the laboratory's packages, sorted by entry point and file name.

    Raises
    ------
    BadRequest
        An entry point that cannot be loaded or names no package with plan files, or a name that is taken.
    InvalidSheet
        A plan file that is no plan.
    """
    taken = dict.fromkeys((plan.name for plan in shipped_plans()), "Stillroom")
    found: list[Plan] = []
    for entry in sorted(entry_points(group="stillroom.plans"), key=lambda each: each.name):
        for plan in _plans(entry.name, _loaded(entry)):
            if plan.name in taken:
                raise BadRequest(
                    f"the laboratory's plan {plan.name} from {entry.name} has the name of a plan of {taken[plan.name]}",
                    remedy="give it a name of its own",
                )
            taken[plan.name] = entry.name
            found.append(plan)
    return tuple(found)


def _loaded(entry: EntryPoint) -> ModuleType:
    try:
        loaded = entry.load()
    except (ImportError, AttributeError) as error:
        raise BadRequest(
            f"the laboratory's plans {entry.name} ({entry.value}) cannot be loaded: {error}",
            remedy="mend or remove the package that brings them",
        ) from None
    if not isinstance(loaded, ModuleType):
        raise BadRequest(
            f"the entry point {entry.name} of stillroom.plans ({entry.value}) names no Python package"
        )
    return loaded


def _plans(name: str, package: ModuleType) -> list[Plan]:
    files = sorted(
        (each for each in resources.files(package).iterdir() if each.name.endswith(".toml")),
        key=lambda each: each.name,
    )
    if not files:
        raise BadRequest(f"the laboratory's plans {name}: there is no plan file in {package.__name__}")
    return [
        load_plan(each.read_text(encoding="utf-8"), file=f"{package.__name__}/{each.name}") for each in files
    ]
