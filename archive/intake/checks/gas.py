"""Gas bookkeeping: doses, gauges, the balance, annealing, isotopes, and where the gas went."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.rows import tables
from archive.intake.checks.telling import listed, number, on_row, on_sheet, on_sweep
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from archive.physics.coverage import layer_coverage
from schemas.finding import Finding
from schemas.gas import Dose
from schemas.quantity import unit_factor
from schemas.substrate import Sample

__all__ = [
    "annealing_missing",
    "counted_amounts",
    "coverage_not_stated",
    "dose_not_positive",
    "gas_end_contradiction",
    "gas_end_unknown",
    "gauge_above_range",
    "helium3_content",
    "ledger_balance",
]


def counted_amounts(reading: Reading) -> list[tuple[Dose, float]]:
    """Return the doses that count with their amounts in mol, negative when gas was taken out, from the ledger.

    Notes
    -----
    Empty while the ledger is.
    """
    doses = {dose.name: dose for dose in reading.sheet.dose}
    found = []
    for entry in reading.ledger:
        value = entry.amount.value
        if entry.counted and entry.name in doses and value is not None:
            amount = abs(value) * unit_factor(entry.amount.unit, "amount")
            found.append((doses[entry.name], amount if entry.act == "add" else -amount))
    return found


def dose_not_positive(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find doses whose amount, volume or pressures say that nothing was admitted, or the opposite."""
    for index, dose in enumerate(reading.sheet.dose):
        before, after = dose.pressure_before, dose.pressure_after
        what, key = None, "amount"
        if dose.amount is not None and not dose.amount.si > 0:
            what = f"the amount of dose {dose.name} is not above zero"
        elif before is not None and after is not None:
            key = "pressure_after"
            if before.si < 0 or after.si < 0:
                what = f"a pressure of dose {dose.name} is below zero"
            elif dose.act == "add" and after.si >= before.si:
                what = f"the pressure did not fall when dose {dose.name} was added"
            elif after.si == before.si:
                what = f"the pressures of dose {dose.name} say that nothing was moved"
        if what is not None:
            yield on_sheet(
                reading,
                "dose-not-positive",
                "error",
                what,
                "dose",
                index,
                key,
                place=dose.name,
                found=dose.amount.text
                if dose.amount is not None
                else f"{before.text} before, {after.text} after"
                if before and after
                else None,
                remedy='state amounts above zero; gas that came out has act = "remove" or "recover"',
            )
    for index, doser in enumerate(reading.sheet.doser):
        if not doser.volume.si > 0:
            yield on_sheet(
                reading, "dose-not-positive", "error", f"the volume of doser {doser.name} is not above zero", "doser", index, "volume",
                place=doser.name, found=doser.volume.text, remedy="correct the volume",
            )  # fmt: skip


def gauge_above_range(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find readings above the range of their gauge."""
    ranges = {gauge.name: gauge.range for gauge in reading.sheet.gauge}
    for index, dose in enumerate(reading.sheet.dose):
        full = ranges.get(dose.gauge or "")
        for key in ("pressure_before", "pressure_after"):
            read = getattr(dose, key)
            if full is not None and read is not None and read.si > full.si:
                yield on_sheet(
                    reading,
                    "gauge-above-range",
                    "warning",
                    f"a pressure of dose {dose.name} lies above the range of gauge {dose.gauge}",
                    "dose",
                    index,
                    key,
                    place=dose.name,
                    found=read.text,
                    expected=f"at most {full.text}",
                    remedy="correct the reading, the unit or the range, or waive it with the reason",
                )
    for table in tables(reading):
        for name, channel in table.channels.items():
            full = ranges.get(channel.gauge or "")
            values = table.columns[name]
            if full is None or not channel.use or not (values > full.si).any():
                continue
            row = int(np.nanargmax(values))
            yield on_row(
                table,
                "gauge-above-range",
                "warning",
                f"channel {name} of {table.name} reads above the range of gauge {channel.gauge}",
                row,
                channel=name,
                found=number(float(values[row]), "Pa"),
                expected=f"at most {full.text}",
                remedy="leave the rows out, correct the range, or waive it with the reason",
            )


def ledger_balance(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find cooldowns whose recovered helium is not what was added and not removed."""
    amounts = counted_amounts(reading)
    recovered = -sum(amount for dose, amount in amounts if dose.act == "recover")
    held = sum(amount for dose, amount in amounts if dose.act != "recover")
    last = next((dose for dose, _ in reversed(amounts) if dose.act == "recover"), None)
    if last is None or not held > 0:
        return
    share = (held - recovered) / held
    if abs(share) > thresholds.ledger_warning_fraction:
        beyond = abs(share) > thresholds.ledger_error_fraction
        yield on_sheet(
            reading,
            "ledger-balance",
            "error" if beyond else "warning",
            f"{number(1e6 * held, 'umol')} were in the system and {number(1e6 * recovered, 'umol')} were recovered: {100 * share:.2g} per cent are "
            + ("missing" if share > 0 else "too many"),
            "dose",
            reading.sheet.dose.index(last),
            place=last.name,
            expected=f"within {100 * thresholds.ledger_warning_fraction:g} per cent (ledger_warning_fraction; error beyond "
            f"{100 * thresholds.ledger_error_fraction:g}, ledger_error_fraction)",
            remedy="look for a dose that was not written down or counts twice, the volume of the doser and the zero of the gauge",
        )


def annealing_missing(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find film sweeps that say neither how the film was annealed after the dose nor how long it settled."""
    doses = {dose.name: dose for dose in reading.sheet.dose}
    for table in tables(reading, "temperature-sweep", "dose-run"):
        sweep = table.sweep
        named = sweep.doses if sweep.kind == "dose-run" else tuple(filter(None, (sweep.after_dose,)))
        silent = [
            name
            for name in named
            if name in doses and not doses[name].annealing and doses[name].crossed_out is None
        ]
        if sweep.gas == "helium" and silent and not sweep.settled and reading.substrate_of(sweep) is not None:
            yield on_sweep(
                reading,
                table,
                "annealing-missing",
                "warning",
                f"{table.name} follows {listed(silent)}, and how the film was annealed is not recorded",
                key="settled",
                remedy="write annealing in the dose or settled in the sweep; an uneven film broadens the transition",
            )


def coverage_not_stated(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps of a run with doses that do not say how much helium was in the cell."""
    if not any(dose.crossed_out is None for dose in reading.sheet.dose):
        return
    for table in tables(
        reading,
        "temperature-sweep",
        "drive-sweep",
        "frequency-sweep",
        "ringdown",
        "pulse-response",
        "heat-capacity",
        "persistent-current",
    ):
        sweep = table.sweep
        if sweep.gas == "helium" and not sweep.empty_cell and sweep.after_dose is None and not sweep.doses:
            yield on_sweep(
                reading,
                table,
                "coverage-not-stated",
                "warning",
                f"{table.name} does not say which dose it follows, nor that the cell was empty",
                key="after_dose",
                remedy="add after_dose or empty_cell = true; without it the sweep has no coverage",
            )


def helium3_content(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find helium whose 3He content is not stated, or is large enough to cover the surface."""
    sheet = reading.sheet
    named = [sheet.sample, *(sweep.sample for sweep in sheet.sweep), *(dose.sample for dose in sheet.dose)]
    samples = {
        record.address: record
        for reference in named
        if isinstance(record := reading.record(reference), Sample) and record.isotope == "4He"
    }
    coverage = [
        entry.running_coverage.value * unit_factor(entry.running_coverage.unit, "coverage")
        for entry in reading.ledger
        if entry.running_coverage is not None and entry.running_coverage.value is not None
    ]
    for address, sample in samples.items():
        written = list(sheet.record.sample)
        path: tuple[str | int, ...] = (
            ("record", "sample", written.index(sample)) if sample in written else ("sample",)
        )
        if sample.helium3_fraction is None:
            what = f"the 3He content of {address} is not stated"
            remedy = "state helium3_fraction: well helium has about 0.2 ppm, purified gas less than 1 ppb; or waive it"
            expected = "an amount fraction"
        else:
            layers = max(coverage, default=0.0) / layer_coverage("3.6-angstrom")
            dirt = 1e6 * sample.helium3_fraction.si * layers
            if not dirt > thresholds.helium3_ppm_layers:
                continue
            what = f"{address} brings {number(dirt, 'ppm layers', 3)} of 3He to the surface"
            remedy = "3He lowers the transition temperature; use purified gas or waive it with the reason"
            expected = f"at most {thresholds.helium3_ppm_layers:g} ppm layers (helium3_ppm_layers; layers of 0.36 nm)"
        yield on_sheet(
            reading,
            "helium3-content",
            "warning",
            what,
            *path,
            place=address,
            expected=expected,
            remedy=remedy,
        )


def gas_end_unknown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find runs that do not say what became of the gas."""
    if reading.sheet.gas_end.state == "unknown":
        yield on_sheet(
            reading,
            "gas-end-unknown",
            "warning",
            "what became of the gas at the end of the run is not known",
            "gas_end",
            "state",
            place="gas_end",
            remedy="ask before the cell is warmed or opened; the caution counts all gas that was added",
        )


def gas_end_contradiction(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find runs whose doses contradict what is said of their gas."""
    counted = [dose for dose in reading.sheet.dose if dose.crossed_out is None and dose.act == "add"]
    if reading.sheet.gas_end.state == "never-admitted" and counted:
        yield on_sheet(
            reading,
            "gas-end-contradiction",
            "error",
            f"the sheet says that no gas was admitted, and {len(counted)} dose(s) count",
            "gas_end",
            "state",
            place="gas_end",
            remedy="correct the state, or cross the doses out with the reason",
        )
