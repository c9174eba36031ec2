"""Sheet of the invented cooldown 2025-06, third sound round a ring of glass, with blanks for what is drawn."""

from __future__ import annotations

from typing import Final

__all__ = ["THIRD_SOUND_SHEET"]

_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "considered", reason = "saturated pressure at 0.6 K is below 0.1 Pa, and the film is thin" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "not-applicable", reason = "no pressure was read over the cold film" },
  { effect = "hydrostatic head", state = "not-applicable", reason = "no vapour pressure thermometer" },
  { effect = "self-heating", state = "bounded", bound = "0.05 mK at 0.6 K", reason = "bridge power halved: no change" },
  { effect = "sensor-film offset", state = "considered", reason = "thermometer and ring on one copper plate" },
  { effect = "amplitude dependence", state = "considered", reason = "half the heater power gave the same frequency" },
  { effect = "finite ring time", state = "considered", reason = "Q below 200, an hour between dose and reading" },
  { effect = "elasticity of contents and of cell", state = "not-applicable", reason = "no oscillator" },
  { effect = "slip", state = "not-applicable", reason = "film, no bulk liquid" },
  { effect = "crossing modes", state = "considered", reason = "second and third resonance lie at twice and three times the first" },
  { effect = "viscous drag of vapour", state = "considered", reason = "hardly any vapour at 0.6 K" },
  { effect = "drift of the resonance", state = "not-applicable", reason = "no oscillator" },
  { effect = "remounting shift", state = "not-applicable", reason = "first cooldown of this cell" },
  { effect = "isotopic content", state = "considered", reason = "well gas, 0.2 ppm by the supplier's analysis" },
  { effect = "capillary condensation", state = "considered", reason = "polished glass, unsaturated films" },
  { effect = "gravity rounding", state = "not-applicable", reason = "no lambda point" },
  { effect = "ageing of the thermometer", state = "not-possible-to-know", reason = "not compared since the maker's calibration" },
  { effect = "contamination by frozen air", state = "considered", reason = "line pumped for two days, gas through a trap at 4 K" },
]
"""

THIRD_SOUND_SHEET: Final = (
    """
# Cooldown 2025-06: third sound round a ring, one reading after each dose.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2025-06"
cryostat = "HE3-1"
begin = 2025-06-02T09:00:00+10:00
end = 2025-06-11T17:00:00+10:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Areal superfluid density from third sound, down to where it ends."
outcome = "complete"
next_step = "The same at 0.9 K, and with pulses for comparison."
temperature_scale = "ITS-90"
cell = "TS-1"
sample = "He4-bottle-40"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
[[record.cryostat]]
name = "HE3-1"
revision = 1
kind = "helium-3"
description = "Invented."

[[record.cell]]
name = "TS-1"
revision = 1
kind = "third-sound-ring"
description = "Groove round a glass disc; heater strip and thermometer strip on opposite sides."
material = "glass and copper"
seal = "indium"
shape = "ring"
path_length = { quantity = "100.0(1) mm", known = "measured", source = "travelling microscope, 2025-05" }
closed = true
substrate = "glass-1"
free_volume = { quantity = "2.1(1) cm^3", known = "computed", source = "workshop drawing" }
closable_volume = "4.0(4) cm^3"
closing_valve = "V5"
rated_pressure = "0.30 MPa gauge"
rating_document = "workshop sheet TS-1, pressure test 2025-05-20"
relief_device = "RV-2, set 0.20 MPa gauge, last test 2025-05-20"

[[record.substrate]]
name = "glass-1"
revision = 1
material = "borosilicate glass, fire-polished"
form = "powder of the same glass round the groove"
area = { quantity = "$area m^2", known = "measured", source = "N2 isotherm, 77 K, 2025-05" }
area_method = "N2 at 77 K, 0.162 nm^2 per molecule"
outgassing = "48 h at 380 K"
preplating = "none"
van_der_waals = 27.0

[[record.sample]]
name = "He4-bottle-40"
revision = 1
isotope = "4He"
helium3_fraction = "0.20(5) ppm"
gas_source = "well gas, bottle 40, through charcoal at 77 K and a sinter at 4 K"

[layout.ring]
[layout.ring.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.ring.channels]
time        = { column = "time", quantity = "instant" }
temperature = { column = "T", quantity = "temperature", unit = "K", scale = "ITS-90", uncertainty = "0.1 mK", instrument = "germanium thermometer, calibrated by its maker" }
frequency   = { column = "f", quantity = "frequency", unit = "Hz", uncertainty = "0.05 Hz", instrument = "lock-in 3, first resonance round the ring" }

[[dead_volume]]
name = "cell"
volume = "2.1(1) cm^3"
temperature = "cell"

$doses
[gas_end]
state = "recovered"
valve = "V5 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"

[[sweep]]
name = "s001"
kind = "dose-run"
files = ["raw/third_sound.csv"]
layout = "ring"
doses = [$names]
thermometer = "temperature"
direction = "hold"
settled = "75 min after each dose, warmed to 0.9 K in between"
"""
)
