"""Third sound: reference vectors of speed and thickness, what is refused, and a folder reduced in an archive."""

from __future__ import annotations

import math
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from archive import Archive
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.frenkel_halsey_hill import van_der_waals_strength
from archive.physics.third_sound import third_sound_speed
from archive.reduction.third_sound_steps import (
    OnsetParameters,
    SpeedParameters,
    WallParameters,
    areal_density_from_speed,
    speed_of_third_sound,
    thickness_from_pressure,
    third_sound_onset,
)
from schemas.cell import ThirdSoundRing
from schemas.substrate import Substrate

LABORATORIES = 200
LAYER = 0.36e-9
JUMP = 3.491358e-8
"""Universal jump, kg/(m^2 K): 2 m^2 k_B/(pi hbar^2) from CODATA."""
PLAIN = WallParameters(half_thickness_nm=None)
RETARDED = WallParameters(half_thickness_nm=41.7 * 0.36)


def wall(gamma: float | None = 27.0) -> Substrate:
    """Return a substrate with a Gamma in K layer^3."""
    return Substrate(name="glass", revision=1, material="glass", van_der_waals=gamma)


def ring(closed: bool = True) -> ThirdSoundRing:  # noqa: FBT001, FBT002
    """Return a path of 0.1 m."""
    return ThirdSoundRing.model_validate(
        {"name": "R", "revision": 1, "kind": "third-sound-ring", "path_length": "100 mm", "closed": closed}
    )


@pytest.mark.parametrize(
    ("ratio", "plain", "retarded"),
    [(0.1, 1.9847, 1.9546), (0.5, 2.9613, 2.8958), (0.9, 5.5488, 5.3307), (0.99, 12.1441, 11.2170), (0.999, 26.2030, 22.6724)],
)  # fmt: skip
def test_thickness_of_the_reference_vectors(ratio: float, plain: float, retarded: float) -> None:
    """27 K layer^3 at 1.5 K in layers of 0.36 nm, without retardation and half retarded at 41.7 layers; tabulated to four decimals."""
    for parameters, layers in ((PLAIN, plain), (RETARDED, retarded)):
        found = thickness_from_pressure(
            parameters, relative_pressure=np.array([ratio]), temperature=1.5, substrate=wall()
        )
        assert found.array("thickness")[0] / LAYER == pytest.approx(layers, abs=6e-5)


@pytest.mark.parametrize(
    ("layers", "inert", "retarded"),
    [(3, 56.376, 55.057), (5, 30.827, 29.646), (8, 16.378, 15.399), (10, 11.980, 11.101), (20, 4.414, 3.820)],
)
def test_areal_density_of_the_reference_vectors(layers: int, inert: float, retarded: float) -> None:
    """Tabulated speeds (m/s) of films of which 1.47 layers do not flow: sigma_s is (d - 1.47)/d of the film."""
    n = np.array([layers * 13e-6])
    for parameters, speed in ((PLAIN, inert), (RETARDED, retarded)):
        found = areal_density_from_speed(
            parameters,
            speed=np.array([speed]),
            thickness=np.array([layers * LAYER]),
            coverage=n,
            substrate=wall(),
        )
        share = found.array("superfluid_density")[0] / (MOLAR_MASS_HELIUM4 * n[0])
        # Three decimals of the speed.
        assert share == pytest.approx((layers - 1.47) / layers, rel=2.5 * 5e-4 / speed)


@pytest.mark.parametrize(
    ("given", "closed", "mode", "speed"),
    [
        pytest.param({"frequency": np.array([100.0, -1.0])}, True, 1, 10.0, id="round a ring"),
        pytest.param({"frequency": np.array([100.0, 0.0])}, True, 4, 2.5, id="fourth resonance"),
        pytest.param({"frequency": np.array([100.0, np.nan])}, False, 1, 20.0, id="between ends"),
        pytest.param({"flight_time": np.array([0.01, 0.0])}, False, 1, 10.0, id="time of flight"),
    ],
)
def test_speed(given: dict[str, Any], closed: bool, mode: int, speed: float) -> None:  # noqa: FBT001
    inputs = {"frequency": None, "flight_time": None} | given
    found = speed_of_third_sound(SpeedParameters(mode=mode), path=0.1, cell=ring(closed), **inputs)
    assert found.array("speed")[0] == pytest.approx(speed)
    assert math.isnan(found.array("speed")[1])


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        pytest.param({"frequency": None}, "found neither", id="nothing"),
        pytest.param({"flight_time": np.ones(1)}, "found both", id="both"),
        pytest.param({"path": 0.0}, "path", id="no path"),
    ],
)
def test_a_speed_without_meaning_is_refused(changes: dict[str, Any], words: str) -> None:
    given = {"frequency": np.ones(1), "flight_time": None, "path": 0.1, "cell": ring()} | changes
    with pytest.raises(ValueError, match=words):
        speed_of_third_sound(SpeedParameters(), **given)


def test_without_gamma_nothing_is_computed_and_one_may_be_set() -> None:
    given: dict[str, Any] = {"relative_pressure": np.array([0.9, 1.2]), "temperature": 1.5}
    with pytest.raises(ValueError, match=r"glass\.r1 states no van_der_waals"):
        thickness_from_pressure(PLAIN, substrate=wall(None), **given)
    found = thickness_from_pressure(
        WallParameters(half_thickness_nm=None, gamma_kelvin_layer3=27.0), substrate=wall(None), **given
    )
    assert found.array("thickness")[0] / LAYER == pytest.approx(5.5488, abs=6e-5)
    assert math.isnan(found.array("thickness")[1])
    assert [finding.code for finding in found.findings] == ["gamma-taken-as-exact"]


def test_the_uncertainty_of_gamma_is_one_source_in_thickness_and_density() -> None:
    """Thickness goes as Gamma^(1/3), and sigma_s ~ c^2 d^3/Gamma: what a thickness by pressure gains, the density loses again."""
    parameters = WallParameters(half_thickness_nm=None, gamma_relative_uncertainty=0.1)
    thick = thickness_from_pressure(
        parameters, relative_pressure=np.array([0.9]), temperature=1.5, substrate=wall()
    )
    (name,) = thick.shared["thickness"]
    d = thick.array("thickness")
    assert np.asarray(thick.shared["thickness"][name]) / d == pytest.approx(0.1 / 3, rel=0.01)
    given: dict[str, Any] = {"speed": np.array([30.0]), "coverage": np.array([60e-6]), "substrate": wall()}
    found = areal_density_from_speed(parameters, thickness=d, **given)
    own = np.asarray(found.shared["superfluid_density"][name]) / found.array("superfluid_density")
    assert own == pytest.approx(-0.1, rel=0.02)
    assert thick.sources[0].name == found.sources[0].name == name


def test_thin_films_and_impossible_densities_are_told() -> None:
    thin = thickness_from_pressure(
        PLAIN, relative_pressure=np.array([0.1]), temperature=1.5, substrate=wall()
    )
    assert "film-too-thin-for-slab" in {finding.code for finding in thin.findings}
    whole = float(third_sound_speed(5 * LAYER, strength=float(van_der_waals_strength(27 * LAYER**3))))
    fast = areal_density_from_speed(
        PLAIN, speed=np.array([1.1 * whole]), thickness=np.array([5 * LAYER]), coverage=np.array([60e-6]), substrate=wall()
    )  # fmt: skip
    assert "more-superfluid-than-helium" in {finding.code for finding in fast.findings}


def run(seed: int, *, first: float = 30e-6, noise: float = 4e-10) -> dict[str, Any]:
    """Return areal densities of a run at 0.6 K above an inert layer of 24 umol/m^2, with noise."""
    n = np.linspace(first, 60e-6, 31)
    rng = np.random.default_rng(seed)
    sigma = MOLAR_MASS_HELIUM4 * (n - 24e-6) + noise * rng.normal(size=n.size)
    return {
        "coverage": n,
        "superfluid_density": sigma,
        "temperature": np.full(n.size, 0.6),
        "u_superfluid_density": np.full(n.size, noise),
    }


TRANSITION = 24e-6 + JUMP * 0.6 / MOLAR_MASS_HELIUM4


def test_two_hundred_runs_pull_with_unit_width() -> None:
    pulls: dict[str, list[float]] = {"transition_coverage": [], "lowest_ratio": []}
    truth = {"transition_coverage": TRANSITION, "lowest_ratio": MOLAR_MASS_HELIUM4 * 6e-6 / (JUMP * 0.6)}
    for seed in range(LABORATORIES):
        found = third_sound_onset(OnsetParameters(), **run(seed))
        for name, values in pulls.items():
            values.append((float(found.outputs[name]) - truth[name]) / float(np.asarray(found.point[name])))
    for name, values in pulls.items():
        each = np.array(values)
        assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES), name
        assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES), (name, each.std())


def test_a_density_below_the_universal_line_is_noted() -> None:
    found = third_sound_onset(OnsetParameters(), **run(1, first=26e-6))
    assert [finding.code for finding in found.findings] == ["below-universal-line"]
    assert found.facts["extrapolated"] is False


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        pytest.param({"superfluid_density": np.full(31, np.nan)}, "found 0 films", id="no sound"),
        pytest.param({"superfluid_density": np.linspace(2e-7, 1e-7, 31)}, "no rise", id="falling"),
    ],
)
def test_a_run_without_an_end_is_refused(changes: dict[str, Any], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        third_sound_onset(OnsetParameters(), **run(1) | changes)


SHEET = """\
format = "stillroom-cooldown/1"
name = "2026-07"
cryostat = "fridge.r1"
begin = 2026-07-02T09:00:00+02:00
end = 2026-07-20T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["graduate student"]
purpose = "invented third-sound run for tests"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "ring.r1"
sample = "well-helium.r1"

[gas_end]
state = "recovered"
warmest_temperature = "300 K"

[[record.cryostat]]
name = "fridge"
revision = 1
kind = "dilution"

[[record.cell]]
name = "ring"
revision = 1
kind = "third-sound-ring"
path_length = "100.0(1) mm"
closed = true
substrate = "glass.r1"

[[record.substrate]]
name = "glass"
revision = 1
material = "glass"
area = "1.60(2) m^2"
van_der_waals = 27.0

[[record.sample]]
name = "well-helium"
revision = 1
isotope = "4He"
gas_source = "well gas"

[layout.ring]
dialect = { time_format = "iso8601" }
[layout.ring.channels]
time = { column = "time", quantity = "instant" }
temperature = { column = "T (K)", quantity = "temperature", unit = "K", scale = "ITS-90", uncertainty = "0.1 mK" }
frequency = { column = "f (Hz)", quantity = "frequency", unit = "Hz", uncertainty = "0.05 Hz" }

[[sweep]]
name = "s001"
kind = "dose-run"
files = ["third.csv"]
layout = "ring"
doses = [DOSES]
direction = "hold"
"""

FIRST, STEP, FILMS = 30e-6, 1e-6, 24


def write_ring(folder: Path) -> Path:
    """Write a run of doses on a closed ring at 0.6 K: all above 24 umol/m^2 flows, thickness as bulk liquid."""
    rng = np.random.default_rng(2)
    folder.mkdir(parents=True)
    coverage = FIRST + STEP * np.arange(FILMS)
    begin = datetime.fromisoformat("2026-07-03T08:00:00+02:00")
    doses, rows = [], ["time,T (K),f (Hz)"]
    for k, n in enumerate(coverage):
        amount = (FIRST if k == 0 else STEP) * 1.60 * 1e6
        at = begin + timedelta(hours=2 * k)
        doses.append(
            f'[[dose]]\nname = "d{k:02d}"\nat = {at.isoformat()}\namount = "{amount:.3f}(0.001) umol"\n'
        )
        # One liquid layer by the two-thirds power, 12.9732 umol/m^2, is 0.357768 nm thick.
        d = n / 12.9732e-6 * 0.357768e-9
        whole = float(
            third_sound_speed(d, strength=float(van_der_waals_strength(27 * LAYER**3)), half_thickness=15e-9)
        )
        f = whole * math.sqrt((n - 24e-6) / n) / 0.1 + 0.05 * rng.normal()
        rows.append(f"{(at + timedelta(hours=1)).isoformat()},{0.6 + 1e-4 * rng.normal():.5f},{f:.3f}")
    names = ", ".join(f'"d{k:02d}"' for k in range(FILMS))
    (folder / "cooldown.toml").write_text(
        SHEET.replace("DOSES", names) + "\n" + "\n".join(doses), encoding="utf-8"
    )
    (folder / "third.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    return folder


def test_a_folder_is_reduced_in_an_archive(tmp_path: Path) -> None:
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        taken = lab.ingest(write_ring(tmp_path / "2026-07"))
        assert [finding.sentence() for finding in taken.report.findings if finding.severity == "error"] == []
        (outcome,) = lab.reduce("2026-07")
        assert outcome.problem is None
        assert outcome.document is not None
        found = {each.name: each for each in outcome.document.outputs if each.rows is None}
        assert (
            abs(found["transition_coverage"].value - TRANSITION)
            < 4 * found["transition_coverage"].uncertainty
        )
        # At a given speed sigma_s goes as coverage to the fourth, at the end as its power n/(n - n_0) = 5.6: of the area's
        # 1.25 per cent 1 - 4/5.6 is left.
        expected = 0.0125 * (1 - 4 * (TRANSITION - 24e-6) / TRANSITION) * TRANSITION
        assert found["transition_coverage"].uncertainty == pytest.approx(expected, rel=0.1)
        true = MOLAR_MASS_HELIUM4 * 6e-6 / (JUMP * 0.6)
        assert abs(found["lowest_ratio"].value - true) < 4 * found["lowest_ratio"].uncertainty
        sigma = lab.array(f"{outcome.address}#superfluid_density")
        expected = MOLAR_MASS_HELIUM4 * (FIRST - 24e-6 + STEP * np.arange(FILMS))
        assert sigma == pytest.approx(expected, rel=0.02)
        codes = {finding.code for finding in outcome.document.findings}
        assert "gamma-taken-as-exact" in codes
        assert "step-without-result" not in codes
        assert lab.replay(outcome.address).identical
