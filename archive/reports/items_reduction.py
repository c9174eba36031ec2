"""Checklist items R10 to R12, R36 to R43, R45 to R51 and R54 to R58: loading, background, fits, uncertainty, runs, data."""

from __future__ import annotations

from collections.abc import Iterator

from archive.reports.budget import largest_share, monte_carlo_sentence, percent
from archive.reports.checklist import Item, Said, absence, sentence
from archive.reports.items_gas import step_sentences
from archive.reports.moments import full_time
from archive.reports.scope import Scope

__all__ = ["REDUCTION_ITEMS", "runs_not_used"]

_FITS = "fits"
_FIT_STEPS = (
    "background-fit",
    "loading-fit",
    "power-law-transition",
    "ringdown-quality-factor",
    "resonance-fit",
    "bet-area",
    "universal-crossing",
    "dissipation-peak",
    "film-dynamic-fit",
    "addenda-fit",
    "lambda-heat-capacity",
    "bulk-superfluid-law",
)


def _sensitivity(scope: Scope) -> Iterator[Said]:
    geometric = {reduction.address: each for reduction, each in scope.output("geometric_sensitivity")}
    for reduction, each in scope.output("mass_sensitivity"):
        beside = geometric.get(reduction.address)
        more = f"; geometry predicts {scope.text(beside)}" if beside is not None else ""
        yield sentence(
            f"From {reduction.sweep}, below onset the period rises by {scope.text(each)}{more}.",
            f"{reduction.address}#mass_sensitivity",
        )


def _coupling(scope: Scope) -> Iterator[Said]:
    for reduction, step in scope.steps("loading-fit"):
        departure = step.facts.get("largest_departure")
        if isinstance(departure, float):
            yield sentence(
                f"In {reduction.sweep} the rise stayed proportional to the amount within {100 * departure:.2g} per cent of its whole; that the load is fully coupled is assumed.",
                f"{reduction.address} step {step.number}",
            )


def _background(scope: Scope) -> Iterator[Said]:
    yield from step_sentences("the background", "background-fit", "period-drop", "added-dissipation")(scope)


def _tc(scope: Scope) -> Iterator[Said]:
    yield from step_sentences(
        "the criterion of T_c",
        "static-transition",
        "transition-from-peak",
        "power-law-transition",
        "universal-crossing",
    )(scope)


def _fits(scope: Scope) -> Iterator[Said]:
    for reduction in scope.reductions:
        steps = [step for step in reduction.steps if step.name in _FIT_STEPS]
        if steps:
            names = ", ".join(f"{step.name} (step {step.number})" for step in steps)
            yield sentence(
                f"Fits in {reduction.address}: {names}; ranges, points and values stand with these steps, parameters in the tables.",
                reduction.address,
            )


def _correlation(scope: Scope) -> Iterator[Said]:
    for reduction in scope.reductions:
        for step, held in reduction.covariances.items():
            found = _strongest(held)
            if found is not None:
                a, b, r = found
                yield sentence(
                    f"In {reduction.address}, {step}, the strongest correlation is {r:.2f} between {a} and {b}; the covariance is in the sealed file.",
                    f"{reduction.address} {step}",
                )


def _strongest(held: object) -> tuple[str, str, float] | None:
    if not isinstance(held, dict) or "names" not in held or "matrix" not in held:
        return None
    names, matrix = held["names"], held["matrix"]
    pairs = [
        (names[i], names[j], matrix[i][j] / (matrix[i][i] * matrix[j][j]) ** 0.5)
        for i in range(len(names))
        for j in range(i)
        if matrix[i][i] > 0 and matrix[j][j] > 0
    ]
    return max(pairs, key=lambda each: abs(each[2]), default=None)


def _left_out(scope: Scope) -> Iterator[Said]:
    # The rows left out of a sweep leave every channel that is used: one sentence, with all the steps behind it.
    found: dict[str, list[str]] = {}
    for reduction, step in scope.steps("leave-out"):
        found.setdefault(f"{reduction.sweep}: {step.sentence}", []).append(
            f"{reduction.address} step {step.number}"
        )
    for text, records in found.items():
        yield sentence(f"{text} What keeping them would change was not computed.", "; ".join(records))
    if not found:
        yield sentence("No points were left out.", "the steps of these reductions")


def _budget(scope: Scope) -> Iterator[Said]:
    for reduction in scope.reductions:
        outputs = {each.name: each for each in reduction.outputs if each.rows is None}
        for name in reduction.plan.headline if reduction.address in scope.asked else ():
            share = largest_share(reduction, outputs[name]) if name in outputs else None
            if share is not None:
                term, part = share
                yield sentence(
                    f"Of the variance of {name} of {reduction.address} the largest share, {percent(part)} per cent, is {term}.",
                    f"{reduction.address}#{name}",
                )
                drawn = monte_carlo_sentence(reduction, outputs[name])
                if drawn:
                    yield sentence(f"{name} of {reduction.address} by {drawn}", f"{reduction.address}#{name}")


def _repeat(scope: Scope) -> Iterator[Said]:
    found: dict[str, list[tuple[str, str]]] = {}
    for reduction, each in scope.output("empty_period"):
        if reduction.plan.name == "empty-cell":
            cell = scope.cell_of(reduction).partition(".")[0]
            found.setdefault(cell, []).append((reduction.sweep, scope.text(each)))
    for cell, values in found.items():
        if len(values) > 1:
            yield sentence(
                f"The empty cell {cell} was measured {len(values)} times: {'; '.join(f'{value} in {sweep}' for sweep, value in values)}.",
                cell,
            )


def runs_not_used(scope: Scope) -> Iterator[tuple[str, str, str]]:
    """Yield each sweep that no reduction here uses: address, kind, reason."""
    used = {reduction.sweep for reduction in scope.reductions}
    for held in scope.runs:
        for taken in held.sweeps:
            address = f"{held.sheet.name}/{taken.sheet.name}"
            if address not in used:
                reduced = held.reductions_of(taken.sheet.name)
                reason = f"reduced as {reduced[0].address}, not asked for here" if reduced else "not reduced"
                yield address, taken.sheet.kind.replace("-", " "), reason


def _runs(scope: Scope) -> Iterator[Said]:
    total = sum(len(held.sweeps) for held in scope.runs)
    yield sentence(
        f"Of {total} sweep{'s' * (total != 1)} in {len(scope.runs)} cooldown{'s' * (len(scope.runs) != 1)}, {len(scope.used)} {'is' if len(scope.used) == 1 else 'are'} used; a table names any other and the reason.",
        "the sheets of these cooldowns",
    )


def _events(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        name = held.sheet.name
        if not held.sheet.event:
            yield sentence(f"No event is recorded of {name}.", name)
        for each in held.sheet.event:
            affected = ", ".join(each.sweeps) or "no sweep is named"
            yield sentence(
                f"During {name}, {each.what.replace('-', ' ')} at {full_time(each.at, held.sheet.time_zone)}: {each.text} Sweeps affected: {affected}.",
                name,
            )


def _software(scope: Scope) -> Iterator[Said]:
    versions = sorted(
        {f"stillroom {each.software.stillroom} on Python {each.software.python}" for each in scope.reductions}
    )
    steps = sorted({f"{step.name} {step.version}" for _, step in scope.steps()})
    yield sentence(
        f"Reduced with {', '.join(versions)}; steps and versions: {', '.join(steps)}. A table has every parameter.",
        "the records of the reductions",
    )


def _elastic(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        found = next(
            (each for each in held.sheet.effect if each.effect == "elasticity of contents and of cell"), None
        )
        if found is None:
            yield absence(
                f"elastic contributions in {held.sheet.name}", held.sheet.name, reason="not examined"
            )
        else:
            yield sentence(
                f"Elastic contributions in {held.sheet.name} ({found.state}): {found.reason}.",
                held.sheet.name,
            )


def _path(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        found = next(
            (each for each in held.sheet.effect if each.effect == "desorption in heat capacity"), None
        )
        if found is not None:
            yield sentence(
                f"Desorption in the heat capacity of {held.sheet.name} ({found.state}): {found.reason}.",
                held.sheet.name,
            )


def _drift(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        found = next((each for each in held.sheet.effect if each.effect == "drift of the resonance"), None)
        if found is None:
            yield absence(f"drift of the period in {held.sheet.name}", held.sheet.name, reason="not examined")
        else:
            yield sentence(
                f"Drift of the period in {held.sheet.name} ({found.state}): {found.reason}.", held.sheet.name
            )


REDUCTION_ITEMS: tuple[Item, ...] = (
    Item("R10", "the mass sensitivity", ("TO",), _FITS, _sensitivity),
    Item("R11", "the coupling of the load", ("TO",), _FITS, _coupling),
    Item("R12", "elastic contributions", ("TO",), _FITS, _elastic),
    Item("R36", "the background", ("TO", "HC"), _FITS, _background),
    Item("R37", "drift", ("TO",), _FITS, _drift),
    Item("R38", "chi", ("TO", "PG"), _FITS, step_sentences("chi", "loading-fit")),
    Item("R39", "the superfluid amount", ("TO", "PG"), _FITS, step_sentences("the superfluid amount", "superfluid-density")),
    Item("R40", "the criterion of T_c", ("TO", "PG", "TS", "HC"), _FITS, _tc),
    Item("R41", "the fits", (), _FITS, _fits),
    Item("R42", "correlation of parameters", (), _FITS, _correlation),
    Item("R43", "points left out", (), _FITS, _left_out),
    Item("R45", "the addenda", ("HC",), _FITS, step_sentences("the addenda", "addenda-fit", "molar-heat-capacity")),
    Item("R46", "the path of heat capacity", ("HC",), _FITS, _path),
    Item("R47", "lambda point and gravity", ("HC",), _FITS, step_sentences("lambda point and gravity", "lambda-gravity", "lambda-heat-capacity")),
    Item("R49", "the reduction of third sound", ("TS",), _FITS, lambda _: ()),
    Item("R50", "the uncertainty budget", (), "uncertainty", _budget),
    Item("R51", "repeatability", (), "uncertainty", _repeat),
    Item("R54", "runs used and not used", (), "data", _runs),
    Item("R56", "events", (), "data", _events),
    Item("R57", "software and steps", (), "data", _software),
)  # fmt: skip
