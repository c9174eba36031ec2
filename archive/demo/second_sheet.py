"""Sheet of the invented cooldown 2026-02, with blanks for what is drawn."""

from __future__ import annotations

from typing import Final

from archive.demo.effects import PLANAR_EFFECTS

__all__ = ["SECOND_SHEET"]

SECOND_SHEET: Final = (
    """
# Cooldown 2026-02: the discs again, remounted, thermometer calibrated anew.
# Invented data: made by the forward models of Stillroom's demonstration, no real apparatus.
# Cryostat, discs, gas and thermometer are described in 2025-03.

format = "stillroom-cooldown/1"
name = "2026-02"
cryostat = "DR-1"
begin = 2026-02-09T10:00:00+11:00
end = 2026-03-05T15:00:00+11:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Three more coverages on the discs, and how well the empty cell reproduces after a remount."
outcome = "complete"
next_step = "Fit all seven coverages with one set of b and D."
temperature_scale = "PLTS-2000"
cell = "TO-4"
sample = "He4-well"
licence = "CC0-1.0"

"""
    + PLANAR_EFFECTS
    + """
[[record.cell]]
name = "TO-4"
revision = 2
valid_from = 2026-01-15
changed = "Taken off for a new fill line and mounted again; period 2.3 ns shorter, losses 4 per cent higher. Discs not touched."
kind = "torsional-oscillator"
description = "Stack of polyimide discs in a beryllium copper can on a single rod."
material = "beryllium copper"
seal = "indium, renewed"
shape = "cylinder"
substrate = "PI-2200"
free_volume = "0.45(5) cm^3"
closable_volume = "5.2(5) cm^3"          # shorter fill line
closing_valve = "V7"
rated_pressure = "0.35 MPa gauge"
rating_document = "workshop sheet TO-4, pressure test 2026-01-12"
relief_device = "RV-3, set 0.20 MPa gauge, last test 2026-01-12"
rod_material = "BeCu"
rod = "12 mm long, 1.9 mm diameter, 0.4 mm bore, aged 2 h at 315 C"
inertia = "5.00(5)e-7 kg m^2"
empty_period = "1.003212(1) ms"
mass_sensitivity = "$sensitivity ns/mmol"
rim_radius = "7.5 mm"
gyration_radius_squared = "2.81e-5 m^2"
gap = "1.0(3) um"
mode = "antisymmetric torsion; next mode seen 40 Hz higher"

[[record.calibration]]
name = "RX-2-cal"
revision = 2
changed = "Calibrated again after a year: the old one reads 4 mK high at 0.5 K."
thermometer = "RX-2"
scale = "PLTS-2000"
date = 2026-01-28
against = "melting curve cell MC-1, run book 7, pages 3 to 9"
reading_unit = "Ohm"
relation = { form = "log-polynomial", centre = $centre, coefficients = [$coefficients] }
temperature_low = "15 mK"
temperature_high = "1.0 K"
relative_uncertainty = 1.0e-3

[detection]
torque_exponent = 1
signal_exponent = 1
amplitude_convention = "rms"
bias = "200 V"
quadrature_sign = -1
drive_mode = "constant-drive"
reference_signal = "$signal mV rms"
reference_drive = "0.1000 V rms"
reference_quality_factor = "$quality"
reference_period = "1.003212 ms"
reference_rim_velocity = "$velocity mm/s peak"

[layout.counter]
[layout.counter.dialect]
delimiter = ","
header_rows = 2
time_format = "iso8601"
[layout.counter.channels]
time        = { column = "time", quantity = "instant" }
thermometer = { column = "R_RX2", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "RX-2", calibration = "RX-2-cal.r2", instrument = "ac bridge" }
period      = { column = "P", quantity = "period", unit = "us", uncertainty = "1.5e-6 us", instrument = "counter on the phase-locked loop, 60 s gate" }
amplitude   = { column = "A", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.02 %", instrument = "lock-in 1", sentinels = ["9.9E37"], full_scale = "5 mV" }
drive       = { column = "V", quantity = "drive", unit = "V", convention = "rms", instrument = "synthesiser" }

[layout.decay]
[layout.decay.dialect]
delimiter = "space"
skip_rows = 1
header_comment = true
time_format = "epoch"
[layout.decay.channels]
time      = { column = "t_s", quantity = "instant" }
amplitude = { column = "A_mV", quantity = "amplitude", unit = "mV", convention = "rms", uncertainty = "0.0004 mV" }

[[gauge]]
name = "G1"
range = "10 Torr"
zero = "$zero Torr"
uncertainty = "0.00015 Torr"
relative_uncertainty = 8e-4
calibration = "works certificate 2023"

[[doser]]
name = "D1"
volume = "$volume cm^3"
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

[[sweep]]
name = "s001"
kind = "temperature-sweep"
files = ["raw/ts_empty.csv"]
layout = "counter"
empty_cell = true
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
settled = "one night at base"

[[sweep]]
name = "s002"
kind = "ringdown"
files = ["raw/ringdown_empty.dat"]
layout = "decay"
empty_cell = true
bath_temperature = "0.100(1) K"

[[sweep]]
name = "s003"
kind = "temperature-sweep"
files = ["raw/ts_d05.csv"]
layout = "counter"
after_dose = "d05"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
settled = "annealed at 0.8 K, one night at base"

[[sweep]]
name = "s004"
kind = "temperature-sweep"
files = ["raw/ts_d06_part1.csv", "raw/ts_d06_part2.csv"]
layout = "counter"
after_dose = "d06"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"
notes = "The measuring program stopped at 02:10 and was started again 50 minutes later; temperature held meanwhile."

[[sweep]]
name = "s005"
kind = "temperature-sweep"
files = ["raw/ts_d07.csv"]
layout = "counter"
after_dose = "d07"
thermometer = "thermometer"
direction = "up"
drive = "0.1 V rms"

[[sweep]]
name = "s006"
kind = "log"
files = ["raw/night_d07.csv"]
layout = "counter"
after_dose = "d07"
thermometer = "thermometer"
direction = "hold"
drive = "0.1 V rms"
settled = "six hours at 0.100 K"
notes = "A quiet night, to see how long averaging helps."

[[note]]
at = 2026-02-13T17:00:00+11:00
role = "graduate student"
text = "Empty cell 2.3 ns shorter than last year, shape in T nearly the same."

[[event]]
at = 2026-02-21T02:10:00+11:00
what = "fault"
text = "Measuring program stopped: disk full. Restarted at 03:00."
sweeps = ["s004"]

$waiver"""
)
