"""Sheet of the invented cooldowns of the adsorption cell, with blanks for what differs and for what is drawn."""

from __future__ import annotations

from datetime import datetime
from typing import Final

from archive.demo.recording import stamp

__all__ = ["ADSORPTION_SHEET", "dose_block", "powder_records"]

_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "applied", reason = "the dead volume is measured with helium and its gas taken off" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "considered", reason = "4 mm tube, pressures above 1 kPa" },
  { effect = "hydrostatic head", state = "considered", reason = "gas columns of 1 m, below 0.1 per cent" },
  { effect = "self-heating", state = "not-applicable", reason = "no thermometer in the cell" },
  { effect = "sensor-film offset", state = "considered", reason = "cell in the bath" },
  { effect = "amplitude dependence", state = "not-applicable", reason = "no oscillator" },
  { effect = "finite ring time", state = "considered", reason = "40 min from dose to reading, no change after 20" },
  { effect = "elasticity of contents and of cell", state = "not-applicable", reason = "no oscillator" },
  { effect = "slip", state = "not-applicable", reason = "no oscillator" },
  { effect = "crossing modes", state = "not-applicable", reason = "no oscillator" },
  { effect = "viscous drag of vapour", state = "not-applicable", reason = "no oscillator" },
  { effect = "drift of the resonance", state = "not-applicable", reason = "no oscillator" },
  { effect = "remounting shift", state = "not-applicable", reason = "no oscillator" },
  { effect = "isotopic content", state = "considered", reason = "well gas, 0.2 ppm" },
  { effect = "capillary condensation", state = "considered", reason = "relative pressures up to 0.3" },
  { effect = "gravity rounding", state = "not-applicable", reason = "no lambda point" },
  { effect = "ageing of the thermometer", state = "not-applicable", reason = "bath temperature by its vapour pressure" },
  { effect = "contamination by frozen air", state = "considered", reason = "powder baked at 400 K and pumped for a day" },
]
"""

ADSORPTION_SHEET: Final = (
    """
# Cooldown $name: adsorption cell with silica powder.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "$name"
cryostat = "INS-1"
begin = $begin
end = $end
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "$purpose"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "AC-1"
sample = "He4-AC"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
$records
[[gauge]]
name = "G5"
range = "10 bar"
uncertainty = "3 Pa"
relative_uncertainty = 5e-4
calibration = "works certificate 2025"

[[doser]]
name = "D5"
volume = "$doser cm^3"
how = "weighed full of water, 2025-04"

[[dead_volume]]
name = "capillary"
volume = "$capillary cm^3"
temperature = "295 K"

$doses
[[dose]]
name = "e01"
at = $recovered
act = "recover"
amount = "$amount"
notes = "Everything that came out while warming, in the weighed volume W2."

[gas_end]
state = "recovered"
valve = "V9 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"

[[sweep]]
name = "s001"
kind = "$kind"
files = ["raw/pressures.csv"]
doses = [$names]
bath_temperature = "$bath(2) K on ITS-90"
direction = "hold"
settled = "40 min after each dose, in $bath_is"
dialect = { delimiter = ",", header_rows = 2, time_format = "iso8601" }
[sweep.channels]
time     = { column = "time", quantity = "instant" }
pressure = { column = "p", quantity = "pressure", unit = "Pa", convention = "absolute", uncertainty = "3 Pa", instrument = "G6, at the head of the capillary" }
"""
)

_RECORDS: Final = """\
[[record.cryostat]]
name = "INS-1"
revision = 1
kind = "other"
description = "Dip insert for storage vessels of nitrogen and helium; invented."
site_contact = "cryogenics technician"

[[record.cell]]
name = "AC-1"
revision = 1
kind = "adsorption-cell"
description = "Copper cell filled with silica powder."
material = "copper"
seal = "indium"
shape = "cylinder"
substrate = "silica-1"
sample_mass = "2.004(1) g"
closable_volume = "15(1) cm^3"
closing_valve = "V9"
rated_pressure = "1.5 MPa gauge"
rating_document = "workshop sheet AC-1, pressure test 2025-04-11"
relief_device = "RV-4, set 1.0 MPa gauge, last test 2025-04-11"

[[record.substrate]]
name = "silica-1"
revision = 1
material = "silica powder"
form = "powder, 0.3 um"
mass = "2.004(1) g"
outgassing = "400 K for a day"
preplating = "none"

[[record.sample]]
name = "He4-AC"
revision = 1
isotope = "4He"
helium3_fraction = "0.20(5) ppm"
gas_source = "well gas, bottle 40, through charcoal at 77 K"
area_per_molecule = "0.0847 nm^2"
"""


def powder_records() -> str:
    """Return the records of cell, powder and gas, which the first of the two cooldowns describes."""
    return _RECORDS


def dose_block(number: int, time: datetime, before: float, after: float, room: float) -> str:
    """Return one dose as a block of the sheet; pressures in Pa as the gauge read them, the room's temperature in K."""
    return f'''[[dose]]
name = "d{number:02d}"
at = {stamp(time)}
doser = "D5"
gauge = "G5"
pressure_before = "{before:.2f} Pa"
pressure_after = "{after:.2f} Pa"
temperature_before = "{room:.2f}(1) K on ITS-90"
'''
