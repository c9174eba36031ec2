"""Sheet of the invented cooldown 2025-03, with blanks for what is drawn."""

from __future__ import annotations

from typing import Final

from archive.demo.effects import PLANAR_EFFECTS

__all__ = ["FIRST_SHEET"]

FIRST_SHEET: Final = (
    """
# Cooldown 2025-03: polyimide discs, first run with helium.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.

format = "stillroom-cooldown/1"
name = "2025-03"
cryostat = "DR-1"
begin = 2025-03-10T09:00:00+11:00
end = 2025-04-17T16:30:00+10:00      # summer time ended on 6 April
time_zone = "Australia/Hobart"
operators = ["graduate student", "postdoc"]
purpose = "Find the onset coverage on polyimide and follow the transition temperature with coverage."
outcome = "complete"
next_step = "Repeat two coverages after a remount, to see how far the empty cell reproduces."
temperature_scale = "PLTS-2000"      # room temperatures and 77 K say ITS-90
cell = "TO-4"
sample = "He4-well"
licence = "CC0-1.0"
other_files = ["notes/notebook.txt"]

"""
    + PLANAR_EFFECTS
    + """
# ---------------------------------------------------------------- what was used

[[record.cryostat]]
name = "DR-1"
revision = 1
kind = "dilution"
description = "Dilution refrigerator in the basement, base 9 mK without load."
frequency_reference = "rubidium standard, 1e-10 over a week"
site_contact = "cryogenics technician"

[[record.cell]]
name = "TO-4"
revision = 1
kind = "torsional-oscillator"
description = "Stack of polyimide discs in a beryllium copper can on a single rod."
material = "beryllium copper"
seal = "indium"
shape = "cylinder"
substrate = "PI-2200"
free_volume = "0.45(5) cm^3"
closable_volume = "6.0(5) cm^3"          # cell, fill line and the dead leg at V7
closing_valve = "V7"
rated_pressure = "0.35 MPa gauge"
rating_document = "workshop sheet TO-4, pressure test 2024-11-20"
relief_device = "RV-3, set 0.20 MPa gauge, last test 2024-11-20"
rod_material = "BeCu"
rod = "12 mm long, 1.9 mm diameter, 0.4 mm bore, aged 2 h at 315 C"
inertia = "5.00(5)e-7 kg m^2"
empty_period = "1.003214(1) ms"
mass_sensitivity = "$sensitivity ns/mmol"   # from the drawing; the dose run gives a better one
rim_radius = "7.5 mm"
gyration_radius_squared = "2.81e-5 m^2"
gap = "1.0(3) um"
mode = "antisymmetric torsion; next mode seen 40 Hz higher"

[[record.substrate]]
name = "PI-2200"
revision = 1
material = "polyimide film"
form = "stack of 2200 discs, 15 mm diameter, 7.5 um thick, one roll"
mass = "4.14(4) g"
area = { quantity = "$area m^2", known = "measured", source = "N2 isotherm on an offcut, December 2024" }
area_method = "N2 at 77.3 K (BET), 0.162 nm^2 a molecule, from an earlier run on an offcut; s001 is the check in place"
outgassing = "pumped 48 h at 350 K"
preplating = "none"
layer = "12.97 umol/m^2"
layer_definition = "two-thirds power of the bulk liquid density at SVP, T = 0: 7.813 atoms/nm^2"

[[record.sample]]
name = "He4-well"
revision = 1
isotope = "4He"
helium3_fraction = "0.2 ppm"
gas_source = "bottle 17, well gas 99.9999 per cent, through a charcoal trap at 77 K and a sinter at 4 K"

[[record.sample]]
name = "N2-bottle"
revision = 1
isotope = "N2"
gas_source = "bottle 4, 99.999 per cent, through a cold trap"

[[record.thermometer]]
name = "RX-2"
revision = 1
kind = "ruthenium-oxide"
place = "bolted under the base of TO-4"
serial = "RX-2"
wires = 4
excitation = "3 to 30 uV rms, 13 Hz, below 1 pW at 20 mK"

[[record.calibration]]
name = "RX-2-cal"
revision = 1
thermometer = "RX-2"
scale = "PLTS-2000"
date = 2025-01-22
against = "melting curve cell MC-1, run book 6, pages 40 to 44"
reading_unit = "Ohm"
relation = { form = "log-polynomial", centre = $centre, coefficients = [$coefficients] }
temperature_low = "15 mK"
temperature_high = "1.0 K"
relative_uncertainty = 1.0e-3

[detection]
torque_exponent = 1            # ac drive on a fixed bias
signal_exponent = 1            # current from the moving electrode
amplitude_convention = "rms"
bias = "200 V"
quadrature_sign = -1           # detuned on purpose on 17 March
drive_mode = "constant-drive"
reference_signal = "$signal mV rms"
reference_drive = "0.1000 V rms"
reference_quality_factor = "$quality"   # three ringdowns, empty, base temperature
reference_period = "1.003214 ms"
reference_rim_velocity = "$velocity mm/s peak"

# ---------------------------------------------------------------- the three programs

[layout.counter]               # measuring computer, writes the offset from UTC
[layout.counter.dialect]
delimiter = ","
header_rows = 2                # names, then units
time_format = "iso8601"
[layout.counter.channels]
time        = { column = "time", quantity = "instant" }
thermometer = { column = "R_RX2", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "RX-2", calibration = "RX-2-cal.r1", instrument = "ac bridge" }
period      = { column = "P", quantity = "period", unit = "us", uncertainty = "1.5e-6 us", instrument = "counter on the phase-locked loop, 60 s gate" }
amplitude   = { column = "A", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.02 %", instrument = "lock-in 1", sentinels = ["9.9E37"], full_scale = "5 mV" }
drive       = { column = "V", quantity = "drive", unit = "V", convention = "rms", instrument = "synthesiser" }

[layout.bench]                 # the old computer by the bench: local time, decimal comma
[layout.bench.dialect]
delimiter = ";"
decimal = ","
header_rows = 1
time_format = "%d.%m.%Y %H:%M:%S"
time_zone = "Australia/Hobart"
[layout.bench.channels]
time        = { column = "Datum", quantity = "instant" }
thermometer = { column = "R_RX2 [Ohm]", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "RX-2", calibration = "RX-2-cal.r1", instrument = "ac bridge" }
period      = { column = "P [us]", quantity = "period", unit = "us", uncertainty = "1.5e-6 us" }
amplitude   = { column = "A [mV]", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.02 %", full_scale = "5 mV" }
drive       = { column = "V [V]", quantity = "drive", unit = "V", convention = "rms" }

[layout.decay]                 # lock-in buffer, dumped by a script
[layout.decay.dialect]
delimiter = "space"
skip_rows = 1
header_comment = true
time_format = "epoch"
[layout.decay.channels]
time      = { column = "t_s", quantity = "instant" }
amplitude = { column = "A_mV", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.0004 mV" }

[layout.sorption]              # sorption set; Latin-1 because of the micro sign
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

# ---------------------------------------------------------------- gas

[[gauge]]
name = "G1"                    # capacitance gauge on the dosing volume
range = "10 Torr"
zero = "$zero Torr"            # pumped overnight, read on 18 March
uncertainty = "0.00015 Torr"
relative_uncertainty = 8e-4
calibration = "works certificate 2023"

[[gauge]]
name = "G2"                    # on the sorption set, nitrogen only
range = "1000 mbar"
uncertainty = "0.01 mbar"
relative_uncertainty = 5e-4

[[doser]]
name = "D1"
volume = { quantity = "$volume cm^3", known = "measured", source = "weighing with water" }
how = "weighed full of water, 2023; confirmed by expansion from a known volume in January 2025"

[[dead_volume]]
name = "cell"
volume = "0.45(5) cm^3"
temperature = "cell"

$doses
[gas_end]
state = "recovered"
valve = "V7 open to the ballast"
valve_open = true
warmest_temperature = "300 K on ITS-90"
notes = "Cell pumped through the ballast for 14 h while warming through 20 K."

# ---------------------------------------------------------------- sweeps

[[sweep]]
name = "s001"
kind = "isotherm"
files = ["raw/sorption/pi2200_n2.txt"]
layout = "sorption"
gas = "adsorptive"
sample = "N2-bottle"
bath_temperature = "77.30(5) K on ITS-90"
corrections = [
  { channel = "pressure", correct = "zero", value = "0.84(5) mbar", known = "measured", source = "G2 pumped for a night, 10 March" },
]
notes = "Taken in place, cryostat standing at nitrogen temperature."

[[sweep]]
name = "s002"
kind = "temperature-sweep"
files = ["raw/ts_empty.csv"]
layout = "counter"
empty_cell = true
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
settled = "one night at base"

[[sweep]]
name = "s003"
kind = "ringdown"
files = ["raw/ringdown_empty.dat"]
layout = "decay"
empty_cell = true
bath_temperature = "0.100(1) K"
notes = "Drive cut at the first row."

[[sweep]]
name = "s004"
kind = "drive-sweep"
files = ["raw/drive_empty.txt"]
layout = "bench"
empty_cell = true
thermometer = "thermometer"
direction = "hold"

[[sweep]]
name = "s005"
kind = "dose-run"
files = ["raw/doserun.txt"]
layout = "bench"
doses = [$run_doses]
thermometer = "thermometer"
direction = "hold"
drive = "0.1 V rms"
settled = "90 min after each dose, annealed at 0.8 K"
notes = "Twelve readings a dose. Nobody here at the weekend of 22 March: the record has a gap."

[[sweep]]
name = "s006"
kind = "temperature-sweep"
files = ["raw/ts_d19.csv"]
layout = "counter"
after_dose = "d19"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
settled = "annealed at 0.8 K, then one night at base"
left_out = [
  { rows = [41, 52], reason = "helium transfer: the dewar shook and the loop lost phase" },
]
disturbances = [
  { at = 2025-03-27T21:41:00+11:00, what = "transfer into the main bath" },
]
notes = "Three amplitude readings overflowed while the lock-in changed its range."

[[sweep]]
name = "s007"
kind = "ringdown"
files = ["raw/ringdown_d19.dat"]
layout = "decay"
after_dose = "d19"
bath_temperature = "0.100(1) K"

[[sweep]]
name = "s008"
kind = "temperature-sweep"
files = ["raw/ts_d20_up.csv"]
layout = "counter"
after_dose = "d20"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"

[[sweep]]
name = "s009"
kind = "temperature-sweep"
files = ["raw/ts_d20_down.csv"]
layout = "counter"
after_dose = "d20"
thermometer = "thermometer"
direction = "down"
drive = "0.1 V rms"

[[sweep]]
name = "s010"
kind = "temperature-sweep"
files = ["raw/ts_d21.csv"]
layout = "counter"
after_dose = "d21"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
notes = "Ran through the night in which the clocks went back; this program writes the offset, so nothing is lost."

[[sweep]]
name = "s011"
kind = "drive-sweep"
files = ["raw/drive_d21.txt"]
layout = "bench"
after_dose = "d21"
thermometer = "thermometer"
direction = "hold"
notes = "Begun at 02:30 for the second time that night."
# The bench computer writes local time without offset; 02:30 came twice, the second one is meant.
dialect = { delimiter = ";", decimal = ",", header_rows = 1, time_format = "%d.%m.%Y %H:%M:%S", time_zone = "Australia/Hobart", fold = "later" }

[[sweep]]
name = "s012"
kind = "temperature-sweep"
files = ["raw/ts_r01.csv"]
layout = "counter"
after_dose = "r01"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
settled = "annealed at 0.8 K for 3 h after the removal"

# ---------------------------------------------------------------- notebook

[[note]]
at = 2025-03-17T18:00:00+11:00
role = "graduate student"
text = "Signal phase checked by detuning 20 mHz up and down."

[[note]]
at = 2025-03-24T09:20:00+11:00
role = "graduate student"
text = "Dose run goes on after the weekend; base unchanged."

[[note]]
role = "postdoc"
text = "Onset near 24 umol/m^2, as far as one sees by eye."

[[event]]
at = 2025-03-27T21:41:00+11:00
what = "transfer"
text = "Main bath filled during s006."
sweeps = ["s006"]

[[event]]
at = 2025-04-02T14:05:00+11:00
what = "power-loss"
text = "Two minutes; bridge and counter restarted, period came back within 2 ps."

$waiver
"""
)
