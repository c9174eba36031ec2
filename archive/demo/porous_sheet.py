"""Sheet of the invented cooldown 2026-05, with blanks for what is drawn."""

from __future__ import annotations

from typing import Final

from archive.demo.effects import POROUS_EFFECTS

__all__ = ["POROUS_SHEET"]

POROUS_SHEET: Final = (
    """
# Cooldown 2026-05: film in porous glass.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2026-05"
cryostat = "DR-1"                 # described in 2025-03, the gases too
begin = 2026-05-04T09:00:00+10:00
end = 2026-06-05T12:00:00+10:00
time_zone = "Australia/Hobart"
operators = ["postdoc", "graduate student"]
purpose = "Film on connected pores of 7 nm: is the transition a power law, and with which exponent."
outcome = "complete"
next_step = "Two coverages nearer to onset."
temperature_scale = "PLTS-2000"
cell = "PG-2"
sample = "He4-well"
licence = "CC0-1.0"

"""
    + POROUS_EFFECTS
    + """
[[record.cell]]
name = "PG-2"
revision = 1
kind = "torsional-oscillator"
description = "Rod of porous glass epoxied into a beryllium copper shell."
material = "beryllium copper"
seal = "epoxy"
shape = "cylinder"
substrate = "PGL-7"
free_volume = "3.1(2) cm^3"
closable_volume = "9.0(8) cm^3"
closing_valve = "V9"
rated_pressure = "0.6 MPa gauge"
rating_document = "workshop sheet PG-2, pressure test 2026-03-30"
rod_material = "BeCu"
rod = "14 mm long, 1.6 mm diameter, 0.4 mm bore"
inertia = "1.50(2)e-6 kg m^2"
empty_period = "1.387052(1) ms"
mass_sensitivity = "39.1(6) ns/mmol"
rim_radius = "8.0 mm"
gyration_radius_squared = "2.11e-5 m^2"
gap = "7 nm"
mode = "lowest torsion; next mode seen 1.2 kHz higher"

[[record.substrate]]
name = "PGL-7"
revision = 1
material = "porous glass"
form = "rod 13 mm diameter, 8 mm long, leached and washed"
mass = "1.087(2) g"
area = { quantity = "$area m^2", known = "measured", source = "N2 isotherm on the sister piece" }
area_method = "N2 at 77.3 K (BET), 0.162 nm^2 a molecule, sister piece of the same rod; s001 is the check in place"
pore_diameter = "7.0(5) nm"
porosity = "0.30(2)"
volume = { quantity = "1.062(5) cm^3", known = "measured", source = "calliper, 2026-04" }
outgassing = "390 K for three days"
preplating = "none"

[[record.thermometer]]
name = "GE-1"
revision = 1
kind = "germanium"
place = "in the base of PG-2, with vacuum grease"
serial = "GE-1"
wires = 4
excitation = "constant power, 10 pW below 0.1 K"

[[record.calibration]]
name = "GE-1-cal"
revision = 1
thermometer = "GE-1"
scale = "PLTS-2000"
date = 2026-04-16
against = "RX-2 by its calibration of January 2026, and melting curve cell MC-1"
reading_unit = "Ohm"
relation = { form = "fitted-points" }
# resistance in Ohm, temperature in K
points = [
$points
]
temperature_low = "55 mK"
temperature_high = "1.0 K"
relative_uncertainty = 1.0e-3

[detection]
torque_exponent = 1
signal_exponent = 1
amplitude_convention = "rms"
bias = "120 V"
drive_mode = "constant-drive"
reference_signal = "$signal mV rms"
reference_drive = "0.2000 V rms"
reference_quality_factor = "$quality"
reference_period = "1.387052 ms"
reference_rim_velocity = "$velocity mm/s peak"

[layout.heat]
[layout.heat.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.heat.channels]
time          = { column = "time", quantity = "instant" }
thermometer   = { column = "R_GE1", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "GE-1", calibration = "GE-1-cal.r1", instrument = "ac bridge" }
heat_capacity = { column = "C", quantity = "heat_capacity", unit = "uJ/K", uncertainty = "1 uJ/K", instrument = "relaxation, computed by the measuring program" }

[layout.counter]               # compressed by the nightly script
[layout.counter.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.counter.channels]
time        = { column = "time", quantity = "instant" }
thermometer = { column = "R_GE1", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "GE-1", calibration = "GE-1-cal.r1" }
period      = { column = "P", quantity = "period", unit = "us", uncertainty = "3e-6 us" }
amplitude   = { column = "A", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.02 %", sentinels = ["9.9E37"], full_scale = "5 mV" }
drive       = { column = "V", quantity = "drive", unit = "V", convention = "rms" }

[layout.bench]
[layout.bench.dialect]
delimiter = ";"
decimal = ","
header_rows = 1
time_format = "%d.%m.%Y %H:%M:%S"
time_zone = "Australia/Hobart"
[layout.bench.channels]
time        = { column = "Datum", quantity = "instant" }
thermometer = { column = "R_GE1 [Ohm]", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "GE-1", calibration = "GE-1-cal.r1" }
period      = { column = "P [us]", quantity = "period", unit = "us", uncertainty = "3e-6 us" }
amplitude   = { column = "A [mV]", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.02 %", full_scale = "5 mV" }
drive       = { column = "V [V]", quantity = "drive", unit = "V", convention = "rms" }

[layout.decay]
[layout.decay.dialect]
delimiter = "space"
skip_rows = 1
header_comment = true
time_format = "epoch"
[layout.decay.channels]
time      = { column = "t_s", quantity = "instant" }
amplitude = { column = "A_mV", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.0004 mV" }

[layout.resonance]
[layout.resonance.dialect]
delimiter = "space"
skip_rows = 1
header_comment = true
time_format = "epoch"
[layout.resonance.channels]
time       = { column = "t_s", quantity = "instant" }
frequency  = { column = "f_Hz", quantity = "frequency", unit = "Hz" }
in_phase   = { column = "X_mV", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.00024 mV" }
quadrature = { column = "Y_mV", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.00024 mV" }

[layout.sorption]
[layout.sorption.dialect]
delimiter = "\\t"
encoding = "latin-1"
skip_rows = 1
time_format = "%Y-%m-%d %H:%M"
time_zone = "Australia/Hobart"
[layout.sorption.channels]
time       = { column = "time", quantity = "instant" }
pressure   = { column = "p (mbar)", quantity = "pressure", unit = "mbar", convention = "absolute", uncertainty = "0.01 mbar", gauge = "G2" }
saturated_pressure = { column = "p0 (mbar)", quantity = "pressure", unit = "mbar", convention = "absolute", description = "saturation pressure over the bath" }
amount     = { column = "n (µmol)", quantity = "amount", unit = "umol", uncertainty = "0.025 %" }

[[gauge]]
name = "G3"
range = "100 mbar"
zero = "$zero mbar"
uncertainty = "0.0005 mbar"
relative_uncertainty = 8e-4

[[gauge]]
name = "G2"
range = "1000 mbar"
uncertainty = "0.01 mbar"
relative_uncertainty = 5e-4

[[doser]]
name = "D2"
volume = "$volume cm^3"
how = "expansion from D1, March 2026"

[[dead_volume]]
name = "cell"
volume = "3.1(2) cm^3"
temperature = "cell"

$doses
[gas_end]
state = "recovered"
valve = "V9 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"
notes = "Glass gives its gas off slowly: pumped for two days up to 60 K."

[[sweep]]
name = "s001"
kind = "isotherm"
files = ["raw/sorption/pgl7_n2.txt"]
layout = "sorption"
gas = "adsorptive"
sample = "N2-bottle"
bath_temperature = "77.30(5) K on ITS-90"
corrections = [
  { channel = "pressure", correct = "zero", value = "0.61(5) mbar", known = "measured", source = "G2 pumped for a night, 4 May" },
]

[[sweep]]
name = "s002"
kind = "temperature-sweep"
files = ["raw/ts_empty.csv.gz"]
layout = "counter"
empty_cell = true
thermometer = "thermometer"
direction = "up"
drive = "0.2 V rms"

[[sweep]]
name = "s003"
kind = "frequency-sweep"
files = ["raw/resonance_empty.dat"]
layout = "resonance"
empty_cell = true
bath_temperature = "0.100(1) K"
drive = "0.2 V rms"
direction = "up"
notes = "Five ring times a point."

[[sweep]]
name = "s004"
kind = "ringdown"
files = ["raw/ringdown_empty.dat"]
layout = "decay"
empty_cell = true
bath_temperature = "0.100(1) K"

[[sweep]]
name = "s005"
kind = "dose-run"
files = ["raw/doserun.txt"]
layout = "bench"
doses = [$run_doses]
thermometer = "thermometer"
direction = "hold"
drive = "0.2 V rms"
settled = "3 h after each dose, annealed at 1 K"

[[sweep]]
name = "s006"
kind = "temperature-sweep"
files = ["raw/ts_d15.csv.gz"]
layout = "counter"
after_dose = "d15"
thermometer = "thermometer"
direction = "up"
drive = "0.2 V rms"

[[sweep]]
name = "s007"
kind = "temperature-sweep"
files = ["raw/ts_d16.csv.gz"]
layout = "counter"
after_dose = "d16"
thermometer = "thermometer"
direction = "up"
drive = "0.2 V rms"

[[sweep]]
name = "s008"
kind = "temperature-sweep"
files = ["raw/ts_d17.csv.gz"]
layout = "counter"
after_dose = "d17"
thermometer = "thermometer"
direction = "up"
drive = "0.2 V rms"

[[sweep]]
name = "s010"
kind = "heat-capacity"
files = ["raw/heat_d16.csv"]
layout = "heat"
after_dose = "d16"
thermometer = "thermometer"
direction = "up"
settled = "one night at 0.5 K"
notes = "Relaxation through the weak link, small steps of 0.1 per cent."

[[sweep]]
name = "s009"
kind = "drive-sweep"
files = ["raw/drive_d17.txt"]
layout = "bench"
after_dose = "d17"
thermometer = "thermometer"
direction = "hold"

[[note]]
role = "postdoc"
text = "No sharp drop anywhere: the period comes back smoothly up to T_c."
"""
)
