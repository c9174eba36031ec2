"""Tables of the methods appendix: cells, thermometers, runs, results, steps, budget, corrections."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from archive.reports.after_the_fact import flag_words, sweep_flags
from archive.reports.budget import budget_rows, percent
from archive.reports.holdings import Holdings
from archive.reports.items_reduction import runs_not_used
from archive.reports.later_pages import effect_states, parameter_text
from archive.reports.numbers import Shown, absent, words
from archive.reports.prose import Piece, Prose, breakable, prose, symbol_of
from archive.reports.scope import Scope
from archive.reports.tex import Tex, tex
from schemas.cell import Calorimeter, Cell, TorsionalOscillator
from schemas.kinds import KINDS
from schemas.lineage import OutputEntry, ReductionDocument, StepRecord, Value
from schemas.quantity import Quantity
from schemas.uncertain_text import in_preferred_unit, rounded
from schemas.units import parse_unit

__all__ = ["Table", "results_table", "tables"]

Cell_ = Shown | Prose


@dataclass(frozen=True)
class Table:
    """One table: label, caption, heads with widths in hundredths of the line, rows of cells."""

    label: str
    caption: str
    heads: tuple[tuple[Tex, int], ...]
    rows: tuple[tuple[Cell_, ...], ...]


def head(text: str, unit: str | None = None) -> Tex:
    """Return a head as quantity over unit."""
    name = prose(text).latex
    return name if unit is None else Tex(rf"{name}~/ $\mathrm{{{parse_unit(unit).latex}}}$")


def bare(quantity: Quantity | None, unit: str) -> Shown:
    """Return the number of a quantity in a unit that stands in the head."""
    if quantity is None:
        return absent("nr")
    shown = quantity.to(unit)
    return _digits(shown.value, shown.uncertainty)


def _digits(value: float, u: float | None, *, setting: bool = False) -> Shown:
    spread = u if u is not None and u > 0 else None
    if spread is None:
        value = float(f"{value:.6g}")
    number = rounded(value, spread)
    tail, tail_tex = ("", "") if spread is not None or setting else (" [u nr]", r"~{[}u~nr{]}")
    return Shown(number.plain() + tail, number.typographic() + tail, Tex(f"${number.maths()}${tail_tex}"))


def value_in(value: Value | None, kind: str, unit: str) -> Shown:
    """Return the number of a document's value in a unit."""
    if value is None or value.value is None:
        return absent("nr")
    spread = value.uncertainty if value.uncertainty else None
    return (
        bare(Quantity(value=value.value, uncertainty=spread, unit=value.unit, kind=kind), unit)
        if spread
        else _digits(
            Quantity(value=value.value, unit=value.unit, kind=kind).to(unit).value, None, setting=True
        )
    )


def number_and_unit(output: OutputEntry) -> tuple[Shown, Shown]:
    """Return number and unit of a result in two cells."""
    if output.value is None:
        return words(output.verdict or "[lost]"), absent("na")
    spread = output.uncertainty if output.uncertainty else None
    if output.quantity not in KINDS:
        return _digits(output.value, spread), words(output.unit)
    shown = in_preferred_unit(
        Quantity(value=output.value, uncertainty=spread, unit=output.unit, kind=output.quantity)
    )
    unit = parse_unit(shown.unit)
    # What was counted is exact.
    return _digits(shown.value, shown.uncertainty, setting=output.quantity == "count"), Shown(
        shown.unit, unit.typographic, Tex(rf"$\mathrm{{{unit.latex}}}$")
    )


def results_table(scope: Scope) -> Table:
    """Return the scalar results of the reductions that were asked for."""
    rows = []
    for reduction in scope.reductions:
        if reduction.address not in scope.asked:
            continue
        entry = scope.taken_of(reduction).entry
        coverage = (
            value_in(entry.coverage if entry else None, "coverage", "umol/m^2")
            if scope.taken_of(reduction).sheet.gas == "helium"
            else absent("na")
        )
        rows += [
            (symbol_of(each.name), prose(reduction.address), coverage, *number_and_unit(each), words(each.scale or "[na]"))
            for each in reduction.outputs
            if each.rows is None
        ]  # fmt: skip
    heads = (
        (head("result"), 17),
        (head("reduction"), 24),
        (head("coverage", "umol/m^2"), 12),
        (head("value"), 19),
        (head("unit"), 15),
        (head("scale"), 13),
    )
    return Table(
        "results", "Results. The bracket is the standard uncertainty in the last digits.", heads, tuple(rows)
    )


def tables(scope: Scope) -> Iterator[Table]:
    """Yield every table but the results."""
    yield _cells(scope)
    yield _thermometers(scope)
    yield _runs(scope)
    yield _not_used(scope)
    yield _steps(scope)
    yield _budget(scope)
    own = frozenset(each.address for each in scope.reductions)
    for held in scope.runs:
        yield _corrections(held, own)


def _cells(scope: Scope) -> Table:
    rows = [_cell(scope, cell) for cell in scope.cells]
    heads = (
        (head("cell"), 11), (head("material"), 14), (head("V", "cm^3"), 10), (head("A", "m^2"), 10), (head("substrate", "g"), 12), (head("P_0", "ms"), 15), (head("Q"), 14),
        (head("from"), 14),
    )  # fmt: skip
    return Table("cells", "Cells, one row for each revision.", heads, tuple(rows))


def _cell(scope: Scope, cell: Cell) -> tuple[Cell_, ...]:
    substrate = next((each for each in scope.substrates if cell.substrate in (each.name, each.address)), None)
    area = None if substrate is None else substrate.area
    is_oscillator = isinstance(cell, TorsionalOscillator)
    period = bare(cell.empty_period, "ms") if isinstance(cell, TorsionalOscillator) else absent("na")
    quality = (
        bare(cell.empty_quality_factor, "1")
        if isinstance(cell, TorsionalOscillator) and cell.empty_quality_factor
        else absent("nr" if is_oscillator or isinstance(cell, Calorimeter) else "na")
    )
    return (
        prose(cell.address), words(cell.material or "[nr]"), bare(cell.free_volume, "cm^3"), bare(area, "m^2"), bare(None if substrate is None else substrate.mass, "g"),
        period, quality, words(str(cell.valid_from) if cell.valid_from else "[nr]"),
    )  # fmt: skip


def _thermometers(scope: Scope) -> Table:
    rows = [
        (
            prose(each.thermometer), prose(each.address), words(each.scale), bare(each.temperature_low, "K"), bare(each.temperature_high, "K"),
            words(str(len(each.points)) if each.points else "[nr]"), words(str(each.date)), prose(each.against),
        )
        for each in scope.calibrations
    ]  # fmt: skip
    heads = (
        (head("sensor"), 9), (head("calibration"), 15), (head("scale"), 12), (head("from", "K"), 11), (head("to", "K"), 11), (head("points"), 7), (head("date"), 12), (head("against"), 23),
    )  # fmt: skip
    return Table(
        "thermometers",
        "Thermometers and calibrations in force; nothing is extrapolated beyond the ends.",
        heads,
        tuple(rows),
    )


def _runs(scope: Scope) -> Table:
    rows = []
    for held, taken in scope.used:
        entry, address = taken.entry, f"{held.sheet.name}/{taken.sheet.name}"
        by = [each for each in scope.reductions if each.sweep == address]
        background = sorted(
            {
                step.inputs["background"].address.partition("#")[0]
                for each in by
                for step in each.steps
                if "background" in step.inputs
            }
        )
        low, high = (None, None) if entry is None else (entry.temperature_low, entry.temperature_high)
        rows.append((
            prose(f"{address}{_marks(held, taken.sheet.name)}"), words(taken.sheet.kind.replace("-", " ")), value_in(None if entry is None else entry.coverage, "coverage", "umol/m^2"), _kelvin(low), _kelvin(high),
            words(taken.sheet.direction), prose(", ".join(background) or "[na]"), prose(", ".join(each.plan.address for each in by)),
        ))  # fmt: skip
    heads = (
        (head("sweep"), 13), (head("kind"), 14), (head("coverage", "umol/m^2"), 13), (head("from", "K"), 9), (head("to", "K"), 9), (head("direction"), 9), (head("background"), 18), (head("used by"), 15),
    )  # fmt: skip
    flags = {code: said for held in scope.runs for code, said in flag_words(held.view).items()}
    meaning = "".join(f" {code}: {said}." for code, said in flags.items())
    return Table("runs", f"Runs used.{meaning}", heads, tuple(rows))


def _marks(held: Holdings, sweep: str) -> str:
    flags = sweep_flags(held.view, sweep)
    return f" ({', '.join(flags)})" if flags else ""


def _kelvin(value: Value | None) -> Shown:
    if value is None or value.value is None:
        return absent("nr")
    return _digits(float(f"{value.value:.4g}"), None, setting=True)


def _not_used(scope: Scope) -> Table:
    rows = tuple(
        (prose(address), words(kind), prose(reason)) for address, kind, reason in runs_not_used(scope)
    )
    return Table(
        "not-used",
        "Runs not used, and why.",
        ((head("sweep"), 20), (head("kind"), 25), (head("reason"), 55)),
        rows,
    )


def narrow(text: str) -> Shown:
    """Return words for a narrow column: they may break every few characters."""
    return Shown(text, text, tex(breakable(text, 13, 12)))


def _steps(scope: Scope) -> Table:
    rows: list[tuple[Cell_, ...]] = []
    for reduction in scope.reductions:
        digests = {each.name: each.digest[:16] for each in reduction.outputs}
        rows.append(
            (prose(f"{reduction.address}, plan {reduction.plan.address} {reduction.plan_digest[:16]}"),)
        )
        rows += [
            (
                words(str(step.number)), narrow(f"{step.name} {step.version}"), narrow(_inputs(reduction, step)),
                narrow("; ".join(f"{name} = {parameter_text(value)}" for name, value in step.parameters.items()) or "none"),
                narrow("; ".join(f"{name} {digests.get(name, '')}" for name in step.outputs)), narrow("; ".join(each.code for each in step.findings) or "none"),
            )
            for step in reduction.steps
        ]  # fmt: skip
    heads = (
        (head("no."), 4),
        (head("operation"), 15),
        (head("inputs"), 28),
        (head("parameters, all"), 22),
        (head("outputs"), 21),
        (head("warnings"), 10),
    )
    caption = (
        "Reduction steps. Digests are the first 16 hexadecimal digits of SHA-256; an input without address is an output of an earlier step here, one with "
        "# alone a channel of the sweep itself. Parameters include those left at their default."
    )
    return Table("steps", caption, heads, tuple(rows))


def _inputs(reduction: ReductionDocument, step: StepRecord) -> str:
    """Return the inputs of a step, those from one place together and what is near in short."""
    places: dict[str, list[str]] = {}
    for port, each in step.inputs.items():
        near, _, part = each.address.partition("#")
        if near == reduction.address:
            place = part
        else:
            place = f"#{part}" if near == reduction.sweep else each.address
            place += f" {each.digest[:16]}" if each.digest else ""
        places.setdefault(place, []).append(port)
    return "; ".join(
        place if ports == [place] else f"{', '.join(ports)}: {place}" for place, ports in places.items()
    )


def _budget(scope: Scope) -> Table:
    rows: list[tuple[Cell_, ...]] = []
    for reduction in scope.reductions:
        outputs = {each.name: each for each in reduction.outputs if each.rows is None}
        for name in reduction.plan.headline:
            each = outputs.get(name)
            if each is None or each.value is None or not each.uncertainty:
                continue
            number, unit = number_and_unit(each)
            title = f"{reduction.address}#{name} = {number.plain}" + (
                f" {unit.plain}" if unit.plain != "1" else ""
            )
            rows.append(
                (
                    Prose(
                        title,
                        (
                            Piece(
                                "",
                                "",
                                Tex(
                                    tex(f"{reduction.address}#{name} = ")
                                    + number.latex
                                    + (rf"\,{unit.latex}" if unit.plain != "1" else "")
                                ),
                            ),
                        ),
                    ),
                )
            )
            total = 0.0
            for term, part, share, common in budget_rows(reduction, each):
                total += share
                rows.append(
                    (
                        prose(term),
                        _digits(float(f"{part:.2g}"), None, setting=True),
                        words(percent(share)),
                        words(common),
                    )
                )
            rows.append((words("sum"), words(""), words(percent(total)), words("")))
    heads = (
        (head("term"), 50),
        (head("contribution, SI"), 18),
        (head("share, per cent"), 14),
        (head("common to"), 18),
    )
    return Table(
        "budget",
        "Uncertainty budget: contributions to the combined standard uncertainty with their sign, in the SI unit of the quantity.",
        heads,
        tuple(rows),
    )


def _corrections(held: Holdings, first: frozenset[str]) -> Table:
    rows: Sequence[tuple[Cell_, ...]] = [
        (words(each["effect"]), words(each["state"]), prose(each["bound"] or "[na]"), prose(each["by"]))
        for each in effect_states(held, first)
    ]
    return Table(
        f"effects-{held.sheet.name}",
        f"Known effects in {held.sheet.name}, each with its one state.",
        ((head("effect"), 36), (head("state"), 22), (head("bound"), 22), (head("step"), 20)),
        tuple(rows),
    )
