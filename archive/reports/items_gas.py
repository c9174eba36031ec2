"""Checklist items R17 to R25: gas handling and coverage."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from archive.reports.checklist import Item, Said, absence, sentence
from archive.reports.holdings import Holdings
from archive.reports.items_cell import plain
from archive.reports.numbers import shown_value
from archive.reports.scope import Scope
from schemas.substrate import Sample

__all__ = ["GAS_ITEMS", "step_sentences"]


def _each_run(says: Callable[[Holdings], list[str]], item: str) -> Callable[[Scope], Iterator[Said]]:
    def over(scope: Scope) -> Iterator[Said]:
        for held in scope.runs:
            texts = says(held)
            name = held.sheet.name
            if not texts:
                yield absence(f"{item} in {name}", name)
            yield from (sentence(text, name) for text in texts)

    return over


def step_sentences(item: str, *names: str) -> Callable[[Scope], Iterator[Said]]:
    """Return a teller of the sentences that some steps wrote about themselves."""

    def over(scope: Scope) -> Iterator[Said]:
        found: dict[str, list[tuple[str, str]]] = {}
        for reduction, step in scope.steps(*names):
            found.setdefault(step.sentence, []).append(
                (reduction.sweep, f"{reduction.address} step {step.number}")
            )
        for text, places in found.items():
            sweeps = ", ".join(dict.fromkeys(sweep for sweep, _ in places))
            yield sentence(f"{sweeps}: {text}", "; ".join(record for _, record in places))
        if not found:
            yield absence(item, "the steps of these reductions", reason="no such step was carried out")

    return over


def _dosers(held: Holdings) -> list[str]:
    return [
        f"In {held.sheet.name} doses were metered from a volume {each.name} of {plain(each.volume)} ({each.how})."
        for each in held.sheet.doser
    ]


def _gauges(held: Holdings) -> list[str]:
    texts = []
    for each in held.sheet.gauge:
        zero = f"zero {plain(each.zero)}" if each.zero is not None else "zero not recorded"
        texts.append(
            f"Pressures in {held.sheet.name} were read on {each.name} ({each.convention}), range {plain(each.range, setting=True)}, {zero}, "
            f"calibration: {each.calibration or 'not recorded'}."
        )
    return texts


def _gas(held: Holdings) -> list[str]:
    sample = held.named(held.sheet.sample)
    if not isinstance(sample, Sample):
        return []
    content = (
        f"3He fraction {plain(sample.helium3_fraction)}"
        if sample.helium3_fraction is not None
        else "the 3He fraction is not recorded"
    )
    return [f"The gas of {held.sheet.name} was {sample.isotope} ({sample.gas_source}); {content}."]


def _doses(held: Holdings) -> list[str]:
    counted = [each for each in held.view.newest.doses if each.counted]
    last = max((k for k, each in enumerate(counted) if each.act == "add"), default=None)
    if last is None:
        return []
    # What is recovered after the last dose says nothing of what was measured.
    counted = counted[: last + 1]
    added = sum(each.act == "add" for each in counted)
    removed = len(counted) - added
    less = f", less {removed} removal{'s' * (removed != 1)}," if removed else ""
    return [
        f"In {held.sheet.name} {added} dose{'s' * (added != 1)}{less} left {shown_value(counted[-1].running_amount, 'amount').plain} in the cell's system."
    ]


def _annealing(held: Holdings) -> list[str]:
    texts = dict.fromkeys(each.annealing for each in held.sheet.dose if each.annealing)
    said = list(texts) + list(
        dict.fromkeys(
            each.sheet.settled for each in held.sweeps if each.sheet.settled and each.sheet.after_dose
        )
    )
    return [f"Annealing in {held.sheet.name}: {'; '.join(str(each) for each in said)}."] if said else []


def _scale(scope: Scope) -> Iterator[Said]:
    for each in scope.substrates:
        if each.layer is None:
            yield sentence(
                f"Coverage on {each.address} is amount over area in umol/m^2, and its scale has no anchor: no layer is defined on this substrate, "
                "and coverage is told per area only.",
                each.address,
            )
        else:
            yield sentence(
                f"Coverage on {each.address} is amount over area in umol/m^2 on the scale of that area; one layer, where used, means {plain(each.layer)}, "
                f"and its anchor is: {each.layer_definition}.",
                each.address,
            )


def _link(_: Scope) -> Iterator[Said]:
    yield sentence(
        "No coverage scale of other work was rescaled to this one, and none of theirs is used here.",
        "the steps of these reductions",
    )


GAS_ITEMS: tuple[Item, ...] = (
    Item("R17", "the dosing volume", ("FS", "PG", "TO", "HC", "TS"), "gas", _each_run(_dosers, "the dosing volume")),
    Item("R18", "the manometer", ("FS", "PG", "TO"), "gas", _each_run(_gauges, "the manometer")),
    Item("R19", "gas, isotopes and cleaning", (), "gas", _each_run(_gas, "gas, isotopes and cleaning")),
    Item("R20", "the list of doses", ("FS", "PG", "TO", "HC", "TS"), "gas", _each_run(_doses, "the list of doses")),
    Item("R21", "the amount that is not in the film", ("FS", "PG", "TO", "HC"), "gas", step_sentences("the amount that is not in the film", "vapour-in-dead-volume")),
    Item("R22", "annealing", ("FS", "PG", "TO", "TS"), "gas", _each_run(_annealing, "annealing")),
    Item("R23", "the coverage scale", ("FS", "PG", "TO", "HC", "TS"), "gas", _scale),
    Item("R24", "the link to other coverage scales", ("FS", "PG", "TO", "HC", "TS"), "gas", _link),
    Item("R25", "the thickness of films", ("FS", "TS"), "gas", step_sentences("the thickness of films", "thickness-from-coverage")),
)  # fmt: skip
