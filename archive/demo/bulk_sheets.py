"""Sheets of the invented cooldowns with bulk liquid, with blanks for what is drawn."""

from __future__ import annotations

from typing import Final

__all__ = ["CALORIMETER_SHEET", "STACK_SHEET"]

_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "considered", reason = "the cell is full of liquid" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "the cell is full of liquid" },
  { effect = "thermal transpiration", state = "$transpiration_state", reason = "$transpiration" },
  { effect = "hydrostatic head", state = "$head_state", reason = "$head" },
  { effect = "self-heating", state = "bounded", bound = "0.1 uK", reason = "bridge power halved: no change" },
  { effect = "sensor-film offset", state = "considered", reason = "the thermometer stands in the liquid" },
  { effect = "amplitude dependence", state = "considered", reason = "$amplitude" },
  { effect = "finite ring time", state = "considered", reason = "$ring" },
  { effect = "elasticity of contents and of cell", state = "considered", reason = "$elastic" },
  { effect = "slip", state = "$slip_state", reason = "$slip" },
  { effect = "crossing modes", state = "considered", reason = "$modes" },
  { effect = "viscous drag of vapour", state = "not-applicable", reason = "no vapour in the cell" },
  { effect = "drift of the resonance", state = "considered", reason = "$drift" },
  { effect = "remounting shift", state = "not-applicable", reason = "not remounted between empty and filled" },
  { effect = "isotopic content", state = "considered", reason = "purified gas, 0.5 ppb" },
  { effect = "capillary condensation", state = "not-applicable", reason = "the cell is full of liquid" },
  { effect = "gravity rounding", state = "$gravity_state", reason = "$gravity" },
  { effect = "ageing of the thermometer", state = "considered", reason = "compared with the lambda point itself" },
  { effect = "contamination by frozen air", state = "considered", reason = "line pumped for two days, gas through a trap at 4 K" },
]
"""

STACK_SHEET: Final = (
    """
# Cooldown 2025-08: stack of discs in bulk liquid, through the lambda point.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2025-08"
cryostat = "HE4-1"
begin = 2025-08-04T09:00:00+10:00
end = 2025-08-15T17:00:00+10:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Normal and superfluid fraction of the bulk, and the exponent of the superfluid density, at three pressures."
outcome = "complete"
temperature_scale = "ITS-90"
cell = "SD-1"
sample = "He4-pure"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
[[record.cryostat]]
name = "HE4-1"
revision = 1
kind = "helium-4"
description = "Bath cryostat with a pumped pot, 1.2 K to 4.2 K."
frequency_reference = "rubidium standard, 1e-10 over a week"
site_contact = "cryogenics technician"

[[record.cell]]
name = "SD-1"
revision = 1
kind = "torsional-oscillator"
description = "Stack of discs with spacers in an aluminium can; full of liquid, no film is meant."
material = "aluminium"
seal = "indium"
shape = "cylinder"
free_volume = "1.9(1) cm^3"
closable_volume = "12(1) cm^3"
closing_valve = "V3"
rated_pressure = "3.5 MPa gauge"
rating_document = "workshop sheet SD-1, pressure test 2025-06-12"
relief_device = "RV-1, set 2.5 MPa gauge, last test 2025-06-12"
rod_material = "BeCu"
rod = "18 mm long, 1.5 mm diameter, 0.4 mm bore"
torsion_constant = "8.1(1) N m/rad"
rim_radius = "8.0 mm"
gap = "$gap um"
mode = "lowest torsion; next mode seen 310 Hz higher"

[[record.sample]]
name = "He4-pure"
revision = 1
isotope = "4He"
helium3_fraction = "0.0005 ppm"
gas_source = "bottle 31, purified gas, through a sinter at 4 K"

[layout.counter]
[layout.counter.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.counter.channels]
time        = { column = "time", quantity = "instant" }
temperature = { column = "T", quantity = "temperature", unit = "K", scale = "ITS-90", uncertainty = "0.004 mK" }
period      = { column = "P", quantity = "period", unit = "us", uncertainty = "4e-6 us" }

[gas_end]
state = "recovered"
valve = "V3 open to the ballast"
valve_open = true
warmest_temperature = "20 K on ITS-90"
notes = "All liquid pumped off through the recovery line before the warm-up."

[[dose]]
name = "d01"
at = 2025-08-08T10:00:00+10:00
amount = "69.3(7) mmol"
notes = "Condensed until the level stood in the filling line."

[[dose]]
name = "d02"
at = 2025-08-12T14:00:00+10:00
amount = "5.6(3) mmol"
notes = "The filling line closed and the cell pressed through the capillary."

[[dose]]
name = "d03"
at = 2025-08-13T12:00:00+10:00
amount = "5.7(3) mmol"

[[dose]]
name = "e01"
at = 2025-08-14T16:00:00+10:00
act = "recover"
amount = "80.7(8) mmol"

[[sweep]]
name = "s001"
kind = "temperature-sweep"
files = ["raw/ts_empty.csv"]
layout = "counter"
empty_cell = true
thermometer = "temperature"
direction = "up"

[[sweep]]
name = "s002"
kind = "temperature-sweep"
files = ["raw/ts_full.csv"]
layout = "counter"
after_dose = "d01"
thermometer = "temperature"
direction = "up"
settled = "a night at 1.5 K"
channels = { pressure = { column = "p", quantity = "pressure", unit = "Pa", convention = "absolute", uncertainty = "6 Pa", description = "over the liquid in the filling line" } }

[[sweep]]
name = "s003"
kind = "temperature-sweep"
files = ["raw/ts_s003.csv"]
layout = "counter"
after_dose = "d02"
thermometer = "temperature"
direction = "up"
settled = "six hours at the pressure"
liquid = { pressure = "$pressure_1 MPa absolute", density = "$density_1 kg/m^3", source = "equation of state of the normal liquid at that pressure" }

[[sweep]]
name = "s004"
kind = "temperature-sweep"
files = ["raw/ts_s004.csv"]
layout = "counter"
after_dose = "d03"
thermometer = "temperature"
direction = "up"
settled = "six hours at the pressure"
liquid = { pressure = "$pressure_2 MPa absolute", density = "$density_2 kg/m^3", source = "equation of state of the normal liquid at that pressure" }

[[note]]
role = "graduate student"
text = "The period stops rising at the lambda point, as it must."
"""
)

CALORIMETER_SHEET: Final = (
    """
# Cooldown 2025-11: heat capacity of bulk liquid at the lambda point.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2025-11"
cryostat = "HE4-1"                # described in 2025-08, the gas too
begin = 2025-11-03T09:00:00+11:00
end = 2025-11-21T17:00:00+11:00
time_zone = "Australia/Hobart"
operators = ["postdoc", "graduate student"]
purpose = "Heat capacity on both sides of the lambda point, by heat pulses, at three pressures."
outcome = "complete"
temperature_scale = "ITS-90"
cell = "CAL-2"
sample = "He4-pure"
licence = "CC0-1.0"

"""
    + _EFFECTS
    + """
[[record.cell]]
name = "CAL-2"
revision = 1
kind = "calorimeter"
description = "Flat copper cell, liquid 3 mm high."
material = "copper"
seal = "indium"
shape = "flat cylinder"
free_volume = "6.1(1) cm^3"
closable_volume = "6.2(1) cm^3"
closing_valve = "VC, at the cell"
rated_pressure = "3.5 MPa gauge"
rating_document = "workshop sheet CAL-2, pressure test 2025-09-30"
relief_device = "burst disc BD-2, 2.5 MPa gauge, fitted 2025-09-30"
helium_amount = "$amount mol"
height = "3.0(1) mm"
addenda = "run of the empty cell, s001"

[layout.pulses]
[layout.pulses.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.pulses.channels]
time        = { column = "time", quantity = "instant" }
temperature = { column = "T", quantity = "temperature", unit = "K", scale = "ITS-90", description = "before the pulse" }
rise        = { column = "dT", quantity = "temperature_difference", unit = "uK", uncertainty = "0.05 %", description = "both drifts extrapolated to the middle of the pulse" }
power       = { column = "W", quantity = "power", unit = "nW" }
duration    = { column = "t_on", quantity = "time", unit = "s" }

[gas_end]
state = "recovered"
valve = "VC open"
valve_open = true
warmest_temperature = "25 K on ITS-90"
notes = "Recovered through the line while cold, then warmed with VC open."

[[dose]]
name = "d01"
at = 2025-11-10T10:00:00+11:00
amount = "$amount mol"

[[dose]]
name = "d02"
at = 2025-11-13T14:00:00+11:00
amount = "$added_1 mol"
notes = "Pressed through the capillary, the cell's valve closed behind it."

[[dose]]
name = "d03"
at = 2025-11-17T14:00:00+11:00
amount = "$added_2 mol"

[[dose]]
name = "e01"
at = 2025-11-20T16:00:00+11:00
act = "recover"
amount = "$recovered mol"

[[sweep]]
name = "s001"
kind = "heat-capacity"
files = ["raw/pulses_empty.csv"]
layout = "pulses"
empty_cell = true
thermometer = "temperature"
direction = "up"

[[sweep]]
name = "s002"
kind = "heat-capacity"
files = ["raw/pulses_full.csv"]
layout = "pulses"
after_dose = "d01"
thermometer = "temperature"
direction = "up"
settled = "a night at 2.0 K"

[[sweep]]
name = "s003"
kind = "heat-capacity"
files = ["raw/pulses_s003.csv"]
layout = "pulses"
after_dose = "d02"
thermometer = "temperature"
direction = "up"
settled = "six hours at the pressure"
liquid = { pressure = "$pressure_1 MPa absolute", density = "$density_1 kg/m^3", amount = "$amount_1 mol", source = "helium metered into the volume of the cell" }

[[sweep]]
name = "s004"
kind = "heat-capacity"
files = ["raw/pulses_s004.csv"]
layout = "pulses"
after_dose = "d03"
thermometer = "temperature"
direction = "up"
settled = "six hours at the pressure"
liquid = { pressure = "$pressure_2 MPa absolute", density = "$density_2 kg/m^3", amount = "$amount_2 mol", source = "helium metered into the volume of the cell" }
"""
)
