"""Where a film is no film: vapour, saturation, capillary liquid, viscous drag, pores."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from archive.intake.checks.drive import diffusion_length_m
from archive.intake.checks.gas import counted_amounts
from archive.intake.checks.rows import counting, frequency_hz, sigma, tables, temperature
from archive.intake.checks.telling import number, on_row, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.physics.coverage import film_thickness_from_coverage
from archive.physics.helium_gas import molar_density
from archive.physics.helium_vapour import capillary_condensation_ratio, saturated_vapour_pressure
from archive.physics.helium_viscosity import viscous_penetration_depth
from schemas.cell import TorsionalOscillator
from schemas.finding import Finding
from schemas.quantity import unit_factor
from schemas.substrate import Sample

__all__ = [
    "capillary_condensation",
    "film_pressure",
    "penetration_depth",
    "pore_size",
    "saturation",
    "saturation_pressure",
    "vapour_share",
]

# Ranges of the properties used: `archive.physics.helium_vapour`, `archive.physics.helium_viscosity`.
_VAPOUR_RANGE = (0.5, 4.2221)
_VISCOSITY_RANGE = (1.0, 4.2221)


def _is_helium4(reading: Reading, table: SweepTable) -> bool:
    sample = reading.record(table.sweep.sample or reading.sheet.sample)
    return table.sweep.gas == "helium" and not (isinstance(sample, Sample) and sample.isotope != "4He")


def _film_tables(reading: Reading) -> Iterator[SweepTable]:
    for table in tables(reading, "temperature-sweep", "dose-run", "heat-capacity"):
        if (
            _is_helium4(reading, table)
            and not table.sweep.empty_cell
            and reading.substrate_of(table.sweep) is not None
        ):
            yield table


def film_pressure(table: SweepTable) -> str | None:
    """Return the channel of the absolute pressure over the film; a thermometer's or a saturation pressure is none."""
    for name, channel in table.channels.items():
        is_absolute = channel.quantity == "pressure" and channel.convention != "gauge"
        if is_absolute and channel.use and channel.thermometer is None and not _names_saturation(name):
            return name
    return None


def saturation_pressure(table: SweepTable) -> str | None:
    """Return the channel of a recorded saturation pressure: one named `saturated_pressure`, `saturation...` or `p0`."""
    for name, channel in table.channels.items():
        if channel.quantity == "pressure" and channel.use and _names_saturation(name):
            return name
    return None


def _names_saturation(name: str) -> bool:
    return name.startswith(("saturat", "p0", "p_0"))


def _amount(reading: Reading, table: SweepTable) -> float | None:
    """Helium in the system during a sweep, mol."""
    last = table.sweep.after_dose or (table.sweep.doses[-1] if table.sweep.doses else None)
    total, seen = 0.0, False
    for dose, amount in counted_amounts(reading):
        total += amount
        if dose.name == last:
            seen = True
            break
    return total if seen and total > 0 else None


def _thickness(reading: Reading, table: SweepTable) -> float | None:
    """Thickness of the film from the ledger's coverage, m."""
    last = table.sweep.after_dose or (table.sweep.doses[-1] if table.sweep.doses else None)
    for entry in reading.ledger:
        coverage = entry.running_coverage
        if entry.name == last and coverage is not None and coverage.value is not None:
            return float(
                film_thickness_from_coverage(coverage.value * unit_factor(coverage.unit, "coverage"))
            )
    return None


def _inside(T: np.ndarray, span: tuple[float, float]) -> np.ndarray:
    return np.asarray(np.isfinite(T) & (span[0] <= T) & (span[1] >= T))


def vapour_share(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find film sweeps in which much of the helium is vapour, where the sheet does not say that it is corrected."""
    states = {effect.effect: effect.state for effect in reading.sheet.effect}
    if (
        states.get("vapour in dead volume") in ("applied", "bounded", "not-applicable")
        or not reading.sheet.dead_volume
    ):
        return
    for table in _film_tables(reading):
        total, T = _amount(reading, table), temperature(reading, table)
        if table.sweep.kind == "dose-run" or total is None or T is None:
            continue
        rows = np.flatnonzero(counting(table) & _inside(T, _VAPOUR_RANGE))
        if len(rows) == 0:
            continue
        name = film_pressure(table)
        measured = name is not None and np.isfinite(table.columns[name][rows]).any()
        if measured and name is not None:
            rows = rows[np.isfinite(table.columns[name][rows])]
        row = rows[int(np.argmax(T[rows]))]
        warmest = float(T[row])
        saturated = float(saturated_vapour_pressure(warmest))
        pressure = (
            min(max(float(table.columns[name][row]), 0.0), saturated)
            if measured and name is not None
            else saturated
        )
        vapour = 0.0
        for volume in reading.sheet.dead_volume:
            at = warmest if isinstance(volume.temperature, str) else volume.temperature.si
            vapour += volume.volume.si * float(molar_density(pressure, at))
        share = vapour / total
        if share <= thresholds.vapour_warning_fraction:
            continue
        word = "is" if measured else "may be, up to saturation,"
        yield on_row(
            table,
            "vapour-share",
            "error" if measured and share > thresholds.vapour_error_fraction else "warning",
            f"{100 * min(share, 1.0):.3g} per cent of the helium of {table.name} {word} vapour at {number(warmest, 'K', 3)}",
            int(row),
            expected=f"at most {100 * thresholds.vapour_warning_fraction:g} per cent, or corrected (vapour_warning_fraction; error beyond "
            f"{100 * thresholds.vapour_error_fraction:g} if measured, vapour_error_fraction)",
            remedy='correct for it and say so: [[effect]] effect = "vapour in dead volume", state = "applied"',
        )


def saturation(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find pressures over a film at or above saturation."""
    for table in _film_tables(reading):
        name, T = film_pressure(table), temperature(reading, table)
        if name is None or T is None:
            continue
        rows = np.flatnonzero(counting(table) & _inside(T, _VAPOUR_RANGE) & np.isfinite(table.columns[name]))
        if len(rows) == 0:
            continue
        ratio = table.columns[name][rows] / np.asarray(saturated_vapour_pressure(T[rows]))
        worst = int(np.argmax(ratio))
        u = sigma(table, name)
        # Three standard uncertainties of the reading may lie above saturation.
        margin = 3 * u / float(saturated_vapour_pressure(float(T[rows[worst]]))) if np.isfinite(u) else 0.0
        if ratio[worst] > thresholds.saturation_fraction:
            yield on_row(
                table,
                "pressure-at-saturation",
                "error" if ratio[worst] > 1 + margin else "warning",
                f"the pressure over the film of {table.name} reaches {float(ratio[worst]):.4g} of saturation at {number(float(T[rows[worst]]), 'K')}",
                int(rows[worst]),
                channel=name,
                expected=f"at most {thresholds.saturation_fraction:g} (saturation_fraction; error above 1)",
                remedy="look at the zero of the gauge and the temperature; leave the rows out, since there is liquid beside the film",
            )


def capillary_condensation(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find pressures at which helium condenses in the pores of the substrate."""
    for table in _film_tables(reading):
        name, T, substrate = (
            film_pressure(table),
            temperature(reading, table),
            reading.substrate_of(table.sweep),
        )
        if name is None or T is None or substrate is None or substrate.pore_diameter is None:
            continue
        free = substrate.pore_diameter.si / 2 - (_thickness(reading, table) or 0.0)
        rows = np.flatnonzero(counting(table) & _inside(T, _VAPOUR_RANGE) & (table.columns[name] > 0))
        if len(rows) == 0 or not free > 0:
            continue
        ratio = table.columns[name][rows] / np.asarray(saturated_vapour_pressure(T[rows]))
        limit = np.asarray(capillary_condensation_ratio(T[rows], free, meniscus="hemispherical"))
        over = np.flatnonzero((ratio > limit) & (ratio <= thresholds.saturation_fraction))
        if len(over):
            at = int(over[0])
            yield on_row(
                table,
                "capillary-condensation",
                "warning",
                f"{len(over)} reading(s) of {table.name} lie above the pressure at which helium condenses in a pore of free radius {number(free * 1e9, 'nm', 3)}",
                int(rows[at]),
                channel=name,
                found=f"p/p0 = {float(ratio[at]):.4g}",
                expected=f"at most {float(limit[at]):.4g} (emptying of the pore)",
                remedy="the coverage is no uniform film there; leave the rows out, or waive it with the reason",
            )


def penetration_depth(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find cells so wide that the normal fluid does not follow the walls."""
    for table in _film_tables(reading):
        cell, T, frequency = (
            reading.cell_of(table.sweep),
            temperature(reading, table),
            frequency_hz(reading, table),
        )
        if not isinstance(cell, TorsionalOscillator) or T is None or frequency is None:
            continue
        substrate = reading.substrate_of(table.sweep)
        widths = [
            each.si / 2
            for each in (cell.gap, None if substrate is None else substrate.pore_diameter)
            if each is not None
        ]
        thickness = _thickness(reading, table)
        # Liquid no thicker than the film, and no wider than the half pore.
        candidates = [*([min(widths)] if widths else []), *([thickness] if thickness is not None else [])]
        rows = counting(table) & _inside(T, _VISCOSITY_RANGE)
        if not candidates or not rows.any():
            continue
        height = min(candidates)
        depth = float(np.min(viscous_penetration_depth(T[rows], frequency)))
        ratio = height / depth
        if ratio > thresholds.penetration_warning_ratio:
            yield on_sweep(
                reading,
                table,
                "penetration-depth",
                "error"
                if ratio > thresholds.penetration_error_ratio and thickness is not None
                else "warning",
                f"half the width of the helium in {table.name} is {ratio:.2g} of the viscous penetration depth {number(depth * 1e6, 'um', 3)}",
                found=number(height * 1e6, "um", 3),
                expected=f"at most {thresholds.penetration_warning_ratio:g} (penetration_warning_ratio; error beyond {thresholds.penetration_error_ratio:g})",
                remedy="the normal fluid is not locked to the walls: use only colder rows, or waive it with the reason",
            )


def pore_size(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find substrates whose pores are too small for the planar theory at the frequency used; once a cell."""
    seen: set[str] = set()
    for table in _film_tables(reading):
        cell, substrate, frequency = (
            reading.cell_of(table.sweep),
            reading.substrate_of(table.sweep),
            frequency_hz(reading, table),
        )
        if (
            not isinstance(cell, TorsionalOscillator)
            or substrate is None
            or substrate.pore_diameter is None
            or frequency is None
        ):
            continue
        if cell.address in seen:
            continue
        seen.add(cell.address)
        half_round = math.pi * substrate.pore_diameter.si / 2
        length = diffusion_length_m(frequency)
        if length > thresholds.pore_length_fraction * half_round:
            yield on_sweep(
                reading,
                table,
                "pore-size",
                "warning",
                f"the diffusion length {number(length * 1e6, 'um', 3)} is {length / half_round:.2g} times half the circumference of the pores of {substrate.address}",
                found=f"pores of {substrate.pore_diameter.text}",
                expected=f"at most {thresholds.pore_length_fraction:g} times (pore_length_fraction)",
                remedy="reduce it as a porous film, not with the planar theory; waive it with that reason",
            )
