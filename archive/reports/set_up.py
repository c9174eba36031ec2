"""The set-up block of a run sheet: cell, oscillator, drive; thermometers, gas, area, coverage scale, background."""

from __future__ import annotations

from archive.reports.holdings import Holdings
from archive.reports.numbers import NOT_RECORDED, Shown, absent, shown, shown_output, words
from schemas.base import NamedRecord
from schemas.cell import Cryostat, TorsionalOscillator
from schemas.quantity import Quantity
from schemas.substrate import Sample, Substrate
from schemas.thermometer import Calibration, Thermometer

__all__ = ["Row", "calibration_rows", "left_column", "record_rows", "right_column", "said"]

Row = tuple[str, Shown]


def said(text: object | None) -> Shown:
    """Return words, or the code of their absence."""
    return NOT_RECORDED if text in (None, "") else words(str(text))


def left_column(held: Holdings) -> list[Row]:
    """Return cell, rod, f0, Q, dP/dn, bias and drive."""
    cell = held.named(held.sheet.cell)
    rows: list[Row] = [("cryostat", _cryostat(held)), ("cell", _cell_words(cell))]
    if isinstance(cell, TorsionalOscillator):
        rows += [
            ("rod", words(f"{cell.rod_material}, {cell.rod}") if cell.rod else words(cell.rod_material)),
            ("empty period", shown(cell.empty_period)),
            (
                "empty Q",
                shown(cell.empty_quality_factor)
                if cell.empty_quality_factor
                else _measured(held, "empty_quality_factor"),
            ),
            ("dP/dn of the record", shown(cell.mass_sensitivity)),
            ("dP/dn measured", _measured(held, "mass_sensitivity")),
            ("mode", said(cell.mode)),
        ]
    detection = held.sheet.detection
    rows += [
        ("bias", shown(None if detection is None else detection.bias, setting=True)),
        ("drive", words("[nr]" if detection is None else detection.drive_mode)),
        ("reference rim speed", shown(None if detection is None else detection.reference_rim_velocity)),
    ]
    if not isinstance(cell, TorsionalOscillator) and detection is None:
        rows = [row for row in rows if row[0] not in ("bias", "drive", "reference rim speed")]
        rows.append(("drive and detection", NOT_RECORDED))
    return rows


def right_column(held: Holdings) -> list[Row]:
    """Return thermometers with scale and calibration, gas, dosing volume, area, coverage scale and background."""
    sheet = held.sheet
    rows: list[Row] = []
    for calibration in _in_force(held):
        ends = f"{shown(calibration.temperature_low, setting=True)} to {shown(calibration.temperature_high, setting=True)}"
        rows.append((calibration.thermometer, words(f"{calibration.scale}, {calibration.address}, {ends}")))
    if not rows:
        rows.append(("thermometer", _bare_thermometers(held)))
    sample = held.named(sheet.sample)
    rows.append(("gas", _gas(sample)))
    rows += [(f"dosing volume {each.name}", shown(each.volume)) for each in sheet.doser] or [
        ("dosing volume", NOT_RECORDED)
    ]
    substrate = substrate_of(held)
    rows.append(("area", shown(area_of(substrate))))
    if substrate is not None and substrate.layer is not None:
        rows.append(("one layer", words(f"{shown(substrate.layer)}: {substrate.layer_definition}")))
    else:
        rows.append(("one layer", words("[nr]; coverage is told per area only")))
    rows.append(("background", _background(held)))
    return rows


def substrate_of(held: Holdings) -> Substrate | None:
    """Return the substrate of the run's cell."""
    found = held.named(getattr(held.named(held.sheet.cell), "substrate", None))
    return found if isinstance(found, Substrate) else None


def area_of(substrate: Substrate | None) -> Quantity | None:
    """Return the area, or the area per mass where only that is recorded."""
    return None if substrate is None else (substrate.area or substrate.specific_area)


def _cryostat(held: Holdings) -> Shown:
    found = held.named(held.sheet.cryostat)
    return (
        words(f"{found.address}, {found.kind}") if isinstance(found, Cryostat) else words(held.sheet.cryostat)
    )


def _cell_words(cell: object) -> Shown:
    if cell is None:
        return NOT_RECORDED
    parts = [getattr(cell, name, None) for name in ("address", "kind", "material", "seal")]
    parts[1] = str(parts[1]).replace("-", " ")
    parts[3] = f"sealed by {parts[3]}" if parts[3] else None
    return words(", ".join(str(part) for part in parts if part))


def _measured(held: Holdings, name: str) -> Shown:
    for reduction in held.view.current:
        for each in reduction.outputs:
            if each.name == name and each.value is not None:
                return words(f"{shown_output(each)} ({reduction.sweep.partition('/')[2]})")
    return absent("pend")


def _in_force(held: Holdings) -> list[Calibration]:
    used = {
        channel.calibration
        for taken in held.sweeps
        if taken.entry is not None
        for channel in taken.entry.channels
        if channel.calibration
    }
    return [each for each in held.of_type(Calibration) if not used or each.address in used]


def _bare_thermometers(held: Holdings) -> Shown:
    names = ", ".join(each.address for each in held.of_type(Thermometer))
    return (
        words(f"{names}, temperatures as recorded on {held.sheet.temperature_scale}")
        if names
        else words(f"[nr]; temperatures as recorded on {held.sheet.temperature_scale}")
    )


def _gas(sample: object) -> Shown:
    if not isinstance(sample, Sample):
        return NOT_RECORDED
    return words(f"{sample.isotope}, 3He {shown(sample.helium3_fraction)}; {sample.gas_source}")


def _background(held: Holdings) -> Shown:
    used = {
        entry.address.partition("#")[0]
        for reduction in held.view.current
        for step in reduction.steps
        for port, entry in step.inputs.items()
        if port == "background"
    }
    own = [each.address for each in held.view.current if each.plan.name == "empty-cell"]
    return words(", ".join(sorted(used)) or ", ".join(own) or "[pend]")


def _field(value: object) -> Shown:
    if isinstance(value, Quantity):
        return shown(value)
    if isinstance(value, bool):
        return words("yes" if value else "no")
    return said(value)


def record_rows(record: NamedRecord) -> list[Row]:
    """Return every field of a record but its name."""
    fields = type(record).model_fields
    skipped = ("name", "revision", "relation", "points")
    return [(name.replace("_", " "), _field(getattr(record, name))) for name in fields if name not in skipped]


def calibration_rows(calibration: Calibration) -> list[Row]:
    """Return what a calibration says: scale, range, relation, points, uncertainty."""
    spread = (
        words(f"{calibration.relative_uncertainty:.2g} of T")
        if calibration.relative_uncertainty is not None
        else shown(calibration.uncertainty, setting=True)
    )
    ends = f"{shown(calibration.temperature_low, setting=True)} to {shown(calibration.temperature_high, setting=True)}; outside nothing is given"
    return [
        ("thermometer", words(calibration.thermometer)), ("scale", words(calibration.scale)), ("date", words(str(calibration.date))),
        ("against", words(calibration.against)), ("relation", words(calibration.relation.form)), ("points", words(str(len(calibration.points)) if calibration.points else "[nr]")),
        ("range", words(ends)), ("standard uncertainty", spread), ("changed", said(calibration.changed)),
        *([] if calibration.made_from is None else [("found by", words(calibration.made_from))]),
    ]  # fmt: skip
