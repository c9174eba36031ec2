"""What the invented sheets say about every known effect; each effect has exactly one state.

Rules: one line per effect, in the order of the closed list of `schemas.cooldown`.
"""

from __future__ import annotations

from typing import Final

__all__ = ["PLANAR_EFFECTS", "POROUS_EFFECTS"]

PLANAR_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "bounded", bound = "0.6 umol at 0.97 K", reason = "saturated pressure in 0.45 cm^3; the film is thin, so the true pressure is several times lower" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "not-applicable", reason = "no pressure was read over the cold film" },
  { effect = "hydrostatic head", state = "not-applicable", reason = "no vapour pressure thermometer" },
  { effect = "self-heating", state = "bounded", bound = "0.05 mK at 20 mK", reason = "bridge power halved at base: reading moved by less" },
  { effect = "sensor-film offset", state = "considered", reason = "sensor bolted to the base of the cell; up and down sweeps agree" },
  { effect = "amplitude dependence", state = "bounded", bound = "3 ps between full and a third of the drive", reason = "drive sweep of the empty cell" },
  { effect = "finite ring time", state = "considered", reason = "ring time 130 s, one point a minute, slow through the transition" },
  { effect = "elasticity of contents and of cell", state = "considered", reason = "amount below 0.1 mmol" },
  { effect = "slip", state = "not-applicable", reason = "film, no bulk liquid" },
  { effect = "crossing modes", state = "considered", reason = "no other mode within 40 Hz" },
  { effect = "viscous drag of vapour", state = "considered", reason = "vapour below 0.6 umol" },
  { effect = "drift of the resonance", state = "applied", reason = "every run is aligned where the film is normal" },
  { effect = "remounting shift", state = "$remounting_state", reason = "$remounting" },
  { effect = "isotopic content", state = "not-possible-to-know", reason = "well gas, 3He fraction not analysed; supplier's figure is in the sample record" },
  { effect = "capillary condensation", state = "considered", reason = "unsaturated films below 40 umol/m^2" },
  { effect = "gravity rounding", state = "not-applicable", reason = "no lambda point" },
  { effect = "ageing of the thermometer", state = "$ageing_state", $ageing_bound reason = "$ageing" },
  { effect = "contamination by frozen air", state = "considered", reason = "line pumped at room temperature for two days, gas through a trap at 4 K" },
]
"""

POROUS_EFFECTS: Final = """\
effect = [
  { effect = "vapour in dead volume", state = "bounded", bound = "1.2 umol at 0.78 K", reason = "saturated pressure in 3.1 cm^3; below 0.1 per cent of the gas" },
  { effect = "desorption in heat capacity", state = "not-applicable", reason = "no heat capacity was measured" },
  { effect = "thermal transpiration", state = "not-applicable", reason = "no pressure was read over the cold film" },
  { effect = "hydrostatic head", state = "not-applicable", reason = "no vapour pressure thermometer" },
  { effect = "self-heating", state = "considered", reason = "germanium at 10 pW below 0.1 K" },
  { effect = "sensor-film offset", state = "considered", reason = "glass is a poor conductor; sweeps were slow" },
  { effect = "amplitude dependence", state = "bounded", bound = "6 ps between full and a third of the drive", reason = "drive sweep with the thickest film" },
  { effect = "finite ring time", state = "considered", reason = "ring time 98 s, one point a minute" },
  { effect = "elasticity of contents and of cell", state = "considered", reason = "3 mmol, stiff glass" },
  { effect = "slip", state = "not-applicable", reason = "film, no bulk liquid" },
  { effect = "crossing modes", state = "considered", reason = "nearest mode 1.9 kHz" },
  { effect = "viscous drag of vapour", state = "considered", reason = "vapour below 2 umol" },
  { effect = "drift of the resonance", state = "applied", reason = "every run is aligned where the film is normal" },
  { effect = "remounting shift", state = "not-applicable", reason = "first cooldown of this cell" },
  { effect = "isotopic content", state = "not-possible-to-know", reason = "well gas, 3He fraction not analysed" },
  { effect = "capillary condensation", state = "considered", reason = "pores are filled above 60 umol/m^2 only; highest coverage is half of that" },
  { effect = "gravity rounding", state = "not-applicable", reason = "no lambda point" },
  { effect = "ageing of the thermometer", state = "not-possible-to-know", reason = "first use of this sensor since its calibration" },
  { effect = "contamination by frozen air", state = "considered", reason = "glass baked at 390 K and pumped for three days" },
]
"""
