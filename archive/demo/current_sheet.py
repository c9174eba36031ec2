"""Sheet of the invented cooldown 2026-06, a persistent-current ring with films and then with liquid."""

from __future__ import annotations

from typing import Final

__all__ = ["CURRENT_SHEET"]

_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "considered", reason = "below 0.1 umol at 0.7 K; the cell is full of liquid later" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "not-applicable", reason = "no pressure was read" },
  { effect = "hydrostatic head", state = "not-applicable", reason = "no vapour pressure thermometer" },
  { effect = "self-heating", state = "considered", reason = "bridge power halved: no change" },
  { effect = "sensor-film offset", state = "considered", reason = "thermometer on the lid of the ring; slow sweeps" },
  { effect = "amplitude dependence", state = "not-applicable", reason = "precession is read, no oscillation" },
  { effect = "finite ring time", state = "not-applicable", reason = "no oscillator" },
  { effect = "elasticity of contents and of cell", state = "not-applicable", reason = "no oscillator" },
  { effect = "slip", state = "considered", reason = "the normal liquid rests in the powder" },
  { effect = "crossing modes", state = "not-applicable", reason = "no oscillator" },
  { effect = "viscous drag of vapour", state = "considered", reason = "hardly any vapour" },
  { effect = "drift of the resonance", state = "not-applicable", reason = "no oscillator" },
  { effect = "remounting shift", state = "not-applicable", reason = "first cooldown of this cell" },
  { effect = "isotopic content", state = "considered", reason = "purified gas, 0.001 ppm" },
  { effect = "capillary condensation", state = "considered", reason = "films below 47 umol/m^2; none between the grains was looked for" },
  { effect = "gravity rounding", state = "considered", reason = "no point is nearer to the lambda point than 5 mK" },
  { effect = "ageing of the thermometer", state = "not-possible-to-know", reason = "not compared since the maker's calibration" },
  { effect = "contamination by frozen air", state = "considered", reason = "line pumped for two days, gas through charcoal at 77 K" },
]
"""

CURRENT_SHEET: Final = (
    """
# Cooldown 2026-06: persistent currents in a packed ring, first in films, then in liquid.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2026-06"
cryostat = "HE3-2"
begin = 2026-06-01T09:00:00+10:00
end = 2026-06-19T15:00:00+10:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Does the angular momentum of a trapped current follow the superfluid density, and how do films lose it?"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "RG-1"
sample = "He4-ring"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
[[record.cryostat]]
name = "HE3-2"
revision = 1
kind = "helium-3"
description = "Invented."

[[record.cell]]
name = "RG-1"
revision = 1
kind = "persistent-current-ring"
description = "Ring packed with powder on a torsion fibre; the angular momentum is read as precession."
material = "epoxy and copper"
seal = "indium"
shape = "ring"
mean_radius = "25.0(1) mm"
width = "6.0(1) mm"
substrate = "powder-1"
free_volume = "8.00(5) cm^3"
closable_volume = "9.5(5) cm^3"
closing_valve = "V2"
rated_pressure = "0.50 MPa gauge"
rating_document = "workshop sheet RG-1, pressure test 2026-04-20"
relief_device = "RV-1, set 0.25 MPa gauge, last test 2026-04-20"

[[record.substrate]]
name = "powder-1"
revision = 1
material = "polishing powder, 0.5 um"
form = "packed to two thirds"
area = { quantity = "20.0(4) m^2", known = "measured", source = "N2 isotherm, 77 K, 2026-04" }
area_method = "N2 at 77 K, 0.162 nm^2 per molecule"

[[record.sample]]
name = "He4-ring"
revision = 1
isotope = "4He"
helium3_fraction = "0.001 ppm"
gas_source = "isotopically purified helium, through charcoal at 77 K"

[layout.ring]
[layout.ring.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.ring.channels]
time             = { column = "time", quantity = "instant" }
temperature      = { column = "T", quantity = "temperature", unit = "K", scale = "ITS-90", uncertainty = "0.02 mK", instrument = "germanium thermometer, calibrated by its maker" }
angular_momentum = { column = "L", quantity = "angular_momentum", unit = "g cm^2/s", uncertainty = "2e-5 g cm^2/s", instrument = "precession of the ring" }

$doses
[gas_end]
state = "recovered"
valve = "V2 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"

[[sweep]]
name = "s001"
kind = "persistent-current"
files = ["raw/hold_film.csv"]
layout = "ring"
after_dose = "d01"
thermometer = "temperature"
direction = "hold"
settled = "current started by rotation above the transition, then cooled"

[[sweep]]
name = "s002"
kind = "persistent-current"
files = ["raw/coverage.csv"]
layout = "ring"
channels = { coverage = { column = "n", quantity = "coverage", unit = "umol/m^2" } }
after_dose = "d01"
thermometer = "temperature"
direction = "hold"
notes = "Helium added in small amounts while the current ran; the program wrote the coverage."

[[sweep]]
name = "s003"
kind = "persistent-current"
files = ["raw/cycle_slow.csv"]
layout = "ring"
after_dose = "d03"
thermometer = "temperature"
direction = "both"
settled = "current started by rotation through the lambda point"

[[sweep]]
name = "s004"
kind = "persistent-current"
files = ["raw/cycle_far.csv"]
layout = "ring"
after_dose = "d03"
thermometer = "temperature"
direction = "both"
notes = "Warmed to 2.165 K; part of the current was gone afterwards."
"""
)
