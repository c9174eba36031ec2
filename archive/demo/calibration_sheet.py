"""Sheet of the invented cooldown 2024-11, in which thermometers are calibrated."""

from __future__ import annotations

from typing import Final

__all__ = ["CALIBRATION_SHEET"]

CALIBRATION_SHEET: Final = """
# Cooldown 2024-11: three thermometers calibrated, one against a bulb of 4He, two against the melting curve.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2024-11"
cryostat = "CB-1"
begin = 2024-11-04T09:00:00+11:00
end = 2024-11-22T15:00:00+11:00
time_zone = "Australia/Hobart"
operators = ["data steward", "graduate student"]
purpose = "Calibrations of GE-7, RX-7 and SP-7 for the cooldowns of the next years."
outcome = "complete"
temperature_scale = "ITS-90"
licence = "CC0-1.0"

effect = [
  { effect = "vapour in dead volume", state = "not-applicable", reason = "no sample gas was admitted" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "applied", reason = "as a step, by the diameter of the tube; the melting pressure line is filled with liquid and solid" },
  { effect = "hydrostatic head", state = "applied", reason = "gas in the tube as a step; the bulb stands beside the sensor, so no liquid is above it" },
  { effect = "self-heating", state = "bounded", bound = "0.01 mK", reason = "power doubled at three temperatures of each sensor, no change seen" },
  { effect = "sensor-film offset", state = "not-applicable", reason = "no film" },
  { effect = "amplitude dependence", state = "not-applicable", reason = "no oscillator" },
  { effect = "finite ring time", state = "not-applicable", reason = "no oscillator" },
  { effect = "elasticity of contents and of cell", state = "not-applicable", reason = "no oscillator" },
  { effect = "slip", state = "not-applicable", reason = "no oscillator" },
  { effect = "crossing modes", state = "not-applicable", reason = "no oscillator" },
  { effect = "viscous drag of vapour", state = "not-applicable", reason = "no oscillator" },
  { effect = "drift of the resonance", state = "not-applicable", reason = "no oscillator" },
  { effect = "remounting shift", state = "not-applicable", reason = "no oscillator" },
  { effect = "isotopic content", state = "considered", reason = "the bulb holds well gas; 0.2 ppm of 3He lowers no pressure that was read" },
  { effect = "capillary condensation", state = "not-applicable", reason = "no film" },
  { effect = "gravity rounding", state = "considered", reason = "no point of the vapour pressure lies within a millikelvin of the lambda point" },
  { effect = "ageing of the thermometer", state = "not-applicable", reason = "the sensors are calibrated here" },
  { effect = "contamination by frozen air", state = "considered", reason = "both lines pumped for two days and filled through a trap at 4 K" },
]

[[record.cryostat]]
name = "CB-1"
revision = 1
kind = "dilution"
description = "Invented. Calibration bench: a vapour pressure bulb for the upper range, a melting pressure cell on the mixing chamber for the lower one."

[[record.thermometer]]
name = "VP-1"
revision = 1
kind = "vapour-pressure-4He"
place = "bulb in the copper block on the 1 K plate, read at the top plate"
tube = { inner_diameter = "$diameter mm", warm_temperature = "295.0 K on ITS-90", height = "$height m", gas_temperature = "$gas K on ITS-90" }

[[record.calibration]]
name = "VP-1-its90"
revision = 1
thermometer = "VP-1"
scale = "ITS-90"
date = 2024-11-04
against = "the definition of the scale"
reading_unit = "Pa"
relation = { form = "vapour-pressure", isotope = "4He" }
temperature_low = "1.25 K"
temperature_high = "5.0 K"
uncertainty = "0.02 mK"

[[record.thermometer]]
name = "MC-1"
revision = 1
kind = "melting-curve"
place = "mixing chamber"

[[record.calibration]]
name = "MC-1-plts"
revision = 1
thermometer = "MC-1"
scale = "PLTS-2000"
date = 2024-11-12
against = "the definition of the scale; gauge calibrated at the pressure minimum"
reading_unit = "Pa"
relation = { form = "melting-curve", branch = "low" }
temperature_low = "0.9 mK"
temperature_high = "315 mK"
uncertainty = "0.005 mK"

[[record.thermometer]]
name = "GE-7"
revision = 1
kind = "germanium"
place = "copper block on the 1 K plate"
wires = 4
excitation = "10 uA rms, 13 Hz"

[[record.thermometer]]
name = "RX-7"
revision = 1
kind = "ruthenium-oxide"
place = "beside MC-1"
wires = 4
excitation = "3 to 30 uV rms, 13 Hz"

[[record.thermometer]]
name = "SP-7"
revision = 1
kind = "paramagnetic"
place = "beside MC-1, salt pill in a coil pair"
excitation = "0.1 mA rms, 77 Hz"

[[gauge]]
name = "G3"
range = "150 kPa"
zero = "$zero Pa"
relative_uncertainty = $gain
calibration = "works certificate 2024"

[layout.bulb.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.bulb.channels]
time       = { column = "time", quantity = "instant" }
pressure   = { column = "p", quantity = "pressure", unit = "Pa", uncertainty = "$pressure_noise %", gauge = "G3", thermometer = "VP-1", calibration = "VP-1-its90" }
resistance = { column = "R_GE7", quantity = "resistance", unit = "Ohm", uncertainty = "$reading_noise %", thermometer = "GE-7", instrument = "ac bridge" }

[layout.melting.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.melting.channels]
time     = { column = "time", quantity = "instant" }
pressure = { column = "p", quantity = "pressure", unit = "MPa", convention = "absolute", uncertainty = "$melting_noise Pa", thermometer = "MC-1", calibration = "MC-1-plts", instrument = "capacitive gauge on the cell" }

[gas_end]
state = "never-admitted"
notes = "The melting pressure cell is permanently filled and has its own line; no sample gas was admitted."

[[sweep]]
name = "c01"
kind = "calibration"
files = ["raw/germanium.csv"]
layout = "bulb"
thermometer = "pressure"
calibrates = "resistance"
direction = "up"
settled = "regulated at each point until pressure and resistance stood still"

[[sweep]]
name = "c02"
kind = "calibration"
files = ["raw/ruthenium_oxide.csv"]
layout = "melting"
channels = { resistance = { column = "R_RX7", quantity = "resistance", unit = "kOhm", uncertainty = "$reading_noise %", thermometer = "RX-7", instrument = "ac bridge" } }
thermometer = "pressure"
calibrates = "resistance"
corrections = [{ channel = "pressure", correct = "zero", value = "$melting_zero", known = "measured", source = "pressure minimum, 12 November" }]
direction = "up"
settled = "20 min at each point"

[[sweep]]
name = "c03"
kind = "calibration"
files = ["raw/salt.csv"]
layout = "melting"
channels = { inductance = { column = "M_SP7", quantity = "mutual_inductance", unit = "uH", uncertainty = "$reading_noise %", thermometer = "SP-7", instrument = "mutual inductance bridge" } }
thermometer = "pressure"
calibrates = "inductance"
corrections = [{ channel = "pressure", correct = "zero", value = "$melting_zero", known = "measured", source = "pressure minimum, 12 November" }]
direction = "up"
settled = "40 min at each point"
"""
