"""One line of the run sheet for each sweep."""

from __future__ import annotations

from collections.abc import Mapping

from archive.reports.after_the_fact import sweep_flags
from archive.reports.holdings import Holdings, Taken
from archive.reports.moments import clock_lines, span_text
from archive.reports.numbers import Shown, absent, shown, shown_output, shown_value
from archive.reports.prose import Piece, Prose, symbol_of
from archive.reports.standing import Standing
from archive.reports.tex import Tex
from schemas.quantity import unit_factor

__all__ = ["SWEEP_HEADS", "sweep_lines"]

COVERAGE, TEMPERATURE, RATE, RIM_SPEED = (
    "coverage / µmol·m⁻²",
    "T from to / K",
    "rate / mK·h⁻¹",
    "rim speed / µm·s⁻¹",
)
SWEEP_HEADS = (
    "no.", "kind", "start", "lasts", COVERAGE, TEMPERATURE, RATE, "drive", RIM_SPEED, "Q", "result", "flags", "file",
)  # fmt: skip
_KINDS = {
    "dose-run": "dose", "drive-sweep": "ampl. test", "frequency-sweep": "resonance", "heat-capacity": "heat cap.", "persistent-current": "current",
    "pulse-response": "response", "drive-pulse": "pulse",
}  # fmt: skip


def sweep_lines(held: Holdings, stands: Standing) -> list[dict[str, str | Prose]]:
    """Return the cells of each sweep line, by head."""
    zone = held.sheet.time_zone
    starts = clock_lines([None if each.entry is None else each.entry.begin for each in held.sweeps], zone)
    files = {file.name: file.sha256 for accession in held.view.accessions for file in accession.raw_files}
    lines = [_line(held, each, stands, files) for each in held.sweeps]
    for line, start in zip(lines, starts, strict=True):
        line["start"] = start
    return lines


def _line(held: Holdings, taken: Taken, stands: Standing, files: Mapping[str, str]) -> dict[str, str | Prose]:
    entry, sweep = taken.entry, taken.sheet
    flags = stands.flags(sweep.name)
    flags += ["X"] if any(not channel.use for channel in held.sheet.channels_of(sweep).values()) else []
    flags += ["L"] if sweep.left_out else []
    flags += sweep_flags(held.view, sweep.name)
    return {
        "no.": sweep.name,
        "kind": _kind(taken),
        "start": "",
        "lasts": "[nr]" if entry is None else span_text(entry.begin, entry.end),
        COVERAGE: "[na]" if sweep.gas == "adsorptive" else ("0" if sweep.empty_cell else _number(shown_value(None if entry is None else entry.coverage, "coverage", unit="umol/m^2"))),
        TEMPERATURE: _temperatures(taken),
        RATE: _rate(taken),
        "drive": str(shown(sweep.drive, setting=True, code="nr" if _driven(taken) else "na")),
        RIM_SPEED: _rim_speed(held, taken),
        "Q": _quality(held, taken),
        "result": _result(held, taken),
        "flags": " ".join(flags),
        "file": files.get(sweep.files[0], "[nr]")[:8],
    }  # fmt: skip


def _number(value: Shown) -> str:
    """Return a number whose unit stands in the head."""
    return value.text.partition("\u00a0")[0] if not value.text.startswith("[") else value.text


def _driven(taken: Taken) -> bool:
    return taken.sheet.kind in ("temperature-sweep", "dose-run", "drive-sweep", "frequency-sweep")


def _kind(taken: Taken) -> str:
    sweep = taken.sheet
    if sweep.kind != "temperature-sweep":
        return _KINDS.get(sweep.kind, sweep.kind)
    if sweep.empty_cell:
        return "background"
    return {"up": "warm", "down": "cool", "hold": "hold"}.get(sweep.direction, "sweep")


def _temperatures(taken: Taken) -> str:
    entry = taken.entry
    if entry is None or entry.temperature_low is None or entry.temperature_low.value is None:
        return "[nr]"
    low, high = entry.temperature_low, entry.temperature_high or entry.temperature_low
    texts = [f"{end.value:.4g}" for end in (low, high)]
    if texts[0] == texts[1]:
        return texts[0]
    direction = taken.sheet.direction
    if direction == "down":
        texts.reverse()
    arrow = "\u2192" if direction in ("up", "down") else ("\u2194" if direction == "both" else "\u2013")
    return f"{texts[0]}\u00a0{arrow} {texts[1]}"


def _rate(taken: Taken) -> str:
    sweep, entry = taken.sheet, taken.entry
    if sweep.rate is not None:
        return _number(shown(sweep.rate.to("mK/h"), setting=True))
    if sweep.kind != "temperature-sweep":
        return "[na]"
    if entry is None or entry.begin is None or entry.end is None or sweep.direction not in ("up", "down"):
        return "[nr]"
    low, high = entry.temperature_low, entry.temperature_high
    hours = (entry.end - entry.begin).total_seconds() / 3600
    if low is None or high is None or low.value is None or high.value is None or hours <= 0:
        return "[nr]"
    sign = "+" if sweep.direction == "up" else "\u2212"
    # Computed from the span, not recorded: marked d.
    return f"{sign}{1e3 * (high.value - low.value) / hours:.3g}\u00a0d"


def _rim_speed(held: Holdings, taken: Taken) -> str:
    detection = held.sheet.detection_of(taken.sheet)
    entry = taken.entry
    if taken.sheet.kind in ("isotherm", "log", "calibration", "heat-capacity"):
        return "[na]"
    speed = None if detection is None else detection.reference_rim_velocity
    signal = None if detection is None else detection.reference_signal
    if entry is None or speed is None or signal is None:
        return "[nr]"
    channel = next(
        (each for each in entry.channels if each.quantity == "amplitude" and each.high is not None), None
    )
    if channel is None or channel.high is None:
        return "[nr]"
    share = channel.high * unit_factor(channel.unit, "amplitude") / signal.si
    return f"{speed.si * share * 1e6:.3g} {speed.convention or ''}\u00a0d"


def _quality(held: Holdings, taken: Taken) -> str:
    found = held.result(taken.sheet.name, "quality_factor")
    if found is not None:
        return str(shown_output(found))
    return str(
        absent("na" if taken.sheet.kind in ("isotherm", "log", "calibration", "heat-capacity") else "nm")
    )


def _result(held: Holdings, taken: Taken) -> str | Prose:
    for reduction in held.reductions_of(taken.sheet.name):
        for each in held.headline(reduction):
            value = shown_output(each)
            if each.verdict is not None:
                return value.text
            name = symbol_of(each.name)
            return Prose(
                f"{name.plain} = {value.plain}",
                (*name.pieces, Piece(f" = {value.text}", "", Tex(f" = {value.latex}"))),
            )
    return str(absent("pend"))
