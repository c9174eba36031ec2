"""Sheet of the invented cooldown 2026-07, a packed resonator with fourth sound, with blanks for its sweeps."""

from __future__ import annotations

from typing import Final

__all__ = ["RESONATOR_SHEET", "record_text", "sweep_text"]

_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "not-applicable", reason = "the cell is full of liquid" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "not-applicable", reason = "no pressure was read" },
  { effect = "hydrostatic head", state = "not-applicable", reason = "no vapour pressure thermometer" },
  { effect = "self-heating", state = "considered", reason = "half the pulse gave the same frequencies" },
  { effect = "sensor-film offset", state = "considered", reason = "thermometer in the liquid beside the resonator" },
  { effect = "amplitude dependence", state = "considered", reason = "half the pulse gave the same frequencies" },
  { effect = "finite ring time", state = "considered", reason = "records are ten times longer than the ring time" },
  { effect = "elasticity of contents and of cell", state = "considered", reason = "walls are stiff against the liquid; their own mode is seen apart" },
  { effect = "slip", state = "considered", reason = "powder of half a micrometre holds the normal part" },
  { effect = "crossing modes", state = "considered", reason = "the mode of the walls at 2.7 kHz is not reached" },
  { effect = "viscous drag of vapour", state = "not-applicable", reason = "no vapour in the cell" },
  { effect = "drift of the resonance", state = "considered", reason = "the mode of the walls does not move" },
  { effect = "remounting shift", state = "not-applicable", reason = "first cooldown of this cell" },
  { effect = "isotopic content", state = "considered", reason = "purified gas, 0.001 ppm" },
  { effect = "capillary condensation", state = "not-applicable", reason = "the cell is full of liquid" },
  { effect = "gravity rounding", state = "not-applicable", reason = "no point is near the lambda point" },
  { effect = "ageing of the thermometer", state = "not-possible-to-know", reason = "not compared since the maker's calibration" },
  { effect = "contamination by frozen air", state = "considered", reason = "line pumped for two days, gas through charcoal at 77 K" },
]
"""

RESONATOR_SHEET: Final = (
    """
# Cooldown 2026-07: fourth sound in a packed resonator, by pulses and by slow sweeps.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2026-07"
cryostat = "HE3-2"
begin = 2026-07-06T09:00:00+10:00
end = 2026-07-17T15:00:00+10:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Superfluid fraction from fourth sound, and whether pulses find the line that slow sweeps find."
outcome = "complete"
temperature_scale = "ITS-90"
cell = "SR-1"
sample = "He4-ring"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
[[record.cell]]
name = "SR-1"
revision = 1
kind = "resonator"
description = "Copper tube packed with powder, capacitor microphones at both ends."
material = "copper"
seal = "indium"
shape = "cylinder"
free_volume = { quantity = "1.3(1) cm^3", known = "computed", source = "workshop drawing, powder two thirds" }
closable_volume = "2.6(3) cm^3"
closing_valve = "V2"
rated_pressure = "0.50 MPa gauge"
rating_document = "workshop sheet SR-1, pressure test 2026-06-22"
relief_device = "RV-1, set 0.25 MPa gauge, last test 2026-06-22"

[layout.pulse]
[layout.pulse.dialect]
delimiter = ","
header_rows = 1
[layout.pulse.channels]
pulse = { column = "V", quantity = "voltage", unit = "V", instrument = "synthesiser, as it was programmed" }

[layout.record]
[layout.record.dialect]
delimiter = ","
header_rows = 2
[layout.record.channels]
x    = { column = "x", quantity = "amplitude", unit = "mV", convention = "peak", instrument = "microphone amplifier and digitiser" }
rate = { column = "rate", quantity = "frequency", unit = "Hz" }

[layout.slow]
[layout.slow.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.slow.channels]
time      = { column = "time", quantity = "instant" }
frequency = { column = "f", quantity = "frequency", unit = "Hz" }
x         = { column = "X", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.002 mV", instrument = "lock-in 2, exp(+i w t)" }
y         = { column = "Y", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.002 mV", instrument = "lock-in 2, exp(+i w t)" }

[[dose]]
name = "d01"
at = 2026-07-07T10:00:00+10:00
amount = "48.2(5) mmol"
notes = "Condensed until the level stood in the filling line."

[[dose]]
name = "e01"
at = 2026-07-16T16:00:00+10:00
act = "recover"
amount = "48.1(5) mmol"

[gas_end]
state = "recovered"
valve = "V2 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"
notes = "All liquid pumped off through the recovery line before the warm-up."

[[sweep]]
name = "p00"
kind = "drive-pulse"
files = ["raw/pulse.csv.gz"]
layout = "pulse"

$sweeps"""
)


def record_text(name: str, temperature: float) -> str:
    """Return the block of one response to the pulse; the temperature in K is that read beside it."""
    return f'''[[sweep]]
name = "{name}"
kind = "pulse-response"
files = ["raw/{name}.csv.gz"]
layout = "record"
after_dose = "d01"
bath_temperature = "{temperature:.4f}(3) K on ITS-90"
'''


def sweep_text(name: str, temperature: float) -> str:
    """Return the block of one slow sweep over the line."""
    return f'''[[sweep]]
name = "{name}"
kind = "frequency-sweep"
files = ["raw/{name}.csv"]
layout = "slow"
after_dose = "d01"
bath_temperature = "{temperature:.4f}(3) K on ITS-90"
direction = "up"
'''
