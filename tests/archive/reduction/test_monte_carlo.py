"""Repetition with drawn inputs: agreement with first order on simulated data of each group, and how it is carried out."""

from __future__ import annotations

import math
import pickle
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from archive.demo.bulk_cooldowns import pulse_begins, stack_temperatures
from archive.demo.bulk_truth import BULK, bulk_period, pulse_readings
from archive.errors import BadRequest
from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.linear_fit import straight_line
from archive.reduction.estimate import Estimate
from archive.reduction.monte_carlo import Request, monte_carlo
from archive.reduction.planning import shipped_plans
from archive.reduction.runner import run
from archive.reduction.step import Covariance, Outcome, Port, Step
from archive.reduction.transition_steps import BEYOND
from schemas.monte_carlo import MonteCarlo, MonteCarloResult
from schemas.substrate import Sample
from tests.small_reduction import Done, formula, number, rectangular, worked


def column(value: np.ndarray, point: float | np.ndarray, kind: str, **shared: Any) -> Estimate:
    """Return a column with its noise."""
    return Estimate(
        value,
        kind,
        np.broadcast_to(np.asarray(point), value.shape).copy(),
        {n: np.asarray(p) for n, p in shared.items()},
    )


def film(laboratory: Any) -> Any:
    """Return the film of the small laboratory, reduced on its empty cell and dose run."""
    return planned(laboratory, "film-transition", "2026-03/f1")


def planned(laboratory: Any, name: str, sweep: str, clock: Any = None) -> Any:
    """Return a shipped plan carried out."""
    plan = next(each for each in shipped_plans() if each.name == name)
    return run(plan, sweep, laboratory, number=7, clock=clock or laboratory.clock)


def oscillator_background(laboratory: Any) -> Any:
    """Return the empty cell's background."""
    return planned(laboratory, "empty-cell", "2026-03/e1")


def isotherm(_: Any) -> Any:
    """Return a BET line with noise on amounts and a volume common to all."""
    x = np.linspace(0.02, 0.30, 15)
    n = 1e-3 * 80 * x / ((1 - x) * (1 + 79 * x))
    n = n + 2e-7 * np.random.default_rng(3).standard_normal(x.size)
    nitrogen = Sample(name="nitrogen", revision=1, isotope="N2", gas_source="cylinder")
    take = {
        "relative_pressure": column(x, 1e-5, "relative_pressure"), "amount": column(n, 2e-7, "amount", volume=0.002 * n), "sample": nitrogen,
    }  # fmt: skip
    chosen = {"low": 0.05, "high": 0.25, "nitrogen_nm2": 0.162}
    return worked(
        [("bet-area", chosen, take, {"monolayer": "monolayer", "constant": "constant", "area": "area"})]
    ).outcome


def third_sound(_: Any) -> Any:
    """Return the onset of third sound above an inert layer of 24 umol/m^2."""
    n = np.linspace(30e-6, 60e-6, 31)
    sigma = MOLAR_MASS_HELIUM4 * (n - 24e-6) + 4e-10 * np.random.default_rng(5).standard_normal(n.size)
    take = {
        "coverage": column(n, 0.0, "coverage", area=0.01 * n), "superfluid_density": column(sigma, 4e-10, "areal_mass_density"),
        "temperature": column(np.full(n.size, 0.6), 0.0, "temperature", calibration=1e-3),
    }  # fmt: skip
    give = {"transition_coverage": "transition_coverage", "lowest_ratio": "lowest_ratio"}
    return worked([("third-sound-onset", {}, take, give)]).outcome


def heat_capacity(_: Any) -> Any:
    """Return addenda and molar heat capacity of the invented calorimeter, and the law at the lambda point."""
    begin, rise = (each[::2] for each in pulse_begins())
    power, read = pulse_readings(begin, rise, filled=True, random=np.random.default_rng(7))
    u = np.hypot(BULK.rise_noise, BULK.rise_share * rise)
    pulsed = {
        "before": column(begin, 0.0, "temperature"), "rise": column(read, u, "temperature_difference"),
        "power": column(np.broadcast_to(np.asarray(power), begin.shape).copy(), 0.0, "power", heater=1e-3 * power), "duration": number(20.0, 0.0, "", "time"),
    }  # fmt: skip
    same = {"temperature": "temperature", "rise": "rise", "heat_capacity": "heat_capacity"}
    molar = {
        "temperature": "temperature",
        "heat_capacity": "heat_capacity",
        "amount": number(BULK.amount, 1e-3 * BULK.amount, "amount", "amount"),
    }
    law = {"temperature": "temperature", "molar_heat_capacity": "molar_heat_capacity", "rise": "rise"}
    # Exponent and logarithmic amplitude are so strongly correlated that only the sum of the great terms is asked for.
    return worked([
        ("heat-capacity-from-pulses", {}, pulsed, same),
        ("molar-heat-capacity", {}, molar, {"molar_heat_capacity": "molar_heat_capacity"}),
        ("lambda-heat-capacity", {"lambda_temperature_kelvin": T_LAMBDA, "highs": (), "corrections": 0, "high": 3e-3}, law, {"constant": "constant"}),
    ]).outcome  # fmt: skip


def bulk(_: Any) -> Any:
    """Return the superfluid fraction of bulk liquid and its power law."""
    T, low, high = stack_temperatures()[::2], 1.45, 2.35
    random = np.random.default_rng(11)
    period = bulk_period(T, filled=True) + BULK.period_noise * random.standard_normal(T.size)
    read = T + BULK.temperature_noise * random.standard_normal(T.size)
    background = np.array(
        [BULK.empty_period + BULK.period_slope * ((low + high) / 2 - 2), BULK.period_slope * (high - low) / 2]
    )
    take = {
        "temperature": column(read, BULK.temperature_noise, "temperature", calibration=2e-4), "period": column(period, BULK.period_noise, "period"),
        "background": column(background, 0.0, "period"), "low": number(low, 0.0, "", "temperature"), "high": number(high, 0.0, "", "temperature"),
        "gap": number(BULK.gap, 0.02 * BULK.gap, "gap", "length"),
    }  # fmt: skip
    give = {name: name for name in ("superfluid_fraction", "coupled_inertia", "lambda_density")}
    law = {
        "temperature": take["temperature"],
        "superfluid_fraction": "superfluid_fraction",
        "lambda_density": "lambda_density",
    }
    results = {name: name for name in ("lambda_temperature", "exponent", "amplitude", "coherence_length")}
    return worked(
        [("bulk-normal-fraction", {}, take, give), ("bulk-superfluid-law", {}, law, results)]
    ).outcome


@pytest.fixture(scope="module")
def laboratory(tools: Any) -> Any:
    """Return the small laboratory with a film of a few rows."""
    data = tools.sweep_data()
    data["f1"] = {name: values[::4] for name, values in data["f1"].items()}
    source = tools.build(data=data)
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    source.clock = tools.Clock()
    return source


@pytest.mark.parametrize(
    ("made", "trials", "names"),
    [
        pytest.param(oscillator_background, 150, {"empty_period", "empty_dissipation"}, id="oscillator background"),
        pytest.param(film, 120, {"T_KT", "crossing_temperature", "background_shift"}, id="film transition"),
        pytest.param(isotherm, 150, {"monolayer", "area"}, id="isotherm"),
        pytest.param(third_sound, 150, {"transition_coverage", "lowest_ratio"}, id="third sound"),
        pytest.param(heat_capacity, 60, {"constant"}, id="heat capacity"),
        pytest.param(bulk, 60, {"lambda_temperature", "exponent", "amplitude", "coherence_length", "coupled_inertia"}, id="bulk"),
    ],
)  # fmt: skip
def test_drawn_and_first_order_agree_on_simulated_data(
    made: Callable[[Any], Any], trials: int, names: set[str], laboratory: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Within four standard uncertainties of what so few trials tell, and of the repetitions with noise alone."""
    monkeypatch.setattr("archive.reduction.monte_carlo.REPETITIONS", (60, 60))
    allowed = 4 * math.sqrt(1 / (2 * trials)) + math.sqrt(2 / 60) / 2
    outcome = made(laboratory)
    drawn = monte_carlo(outcome, Request(trials))
    assert drawn.failed == 0, drawn.reasons
    entries = {each.name: each for each in outcome.document.outputs}
    found = {each.name: each for each in drawn.results}
    assert names <= set(found)
    for name in names:
        entry, each = entries[name], found[name]
        assert each.uncertainty / entry.uncertainty == pytest.approx(1, abs=allowed), name
        assert abs(each.mean - entry.value) < 5 * entry.uncertainty / math.sqrt(trials), name
        assert each.agreement != "differs", name


def test_the_areal_density_past_the_transition_scatters_as_stated(
    reduced: Any, tools: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    """First order alone gives two thirds; the interval stays another one, for the distribution is skewed."""
    outcome = planned(reduced, "film-transition", "2026-03/f1", tools.Clock())
    monkeypatch.setattr("archive.reduction.monte_carlo.REPETITIONS", (30, 30))
    drawn = results(monte_carlo(outcome, Request(150)))
    for name in ("universal_ratio", "density_at_transition"):
        (entry,) = [each for each in outcome.document.outputs if each.name == name]
        assert entry.uncertainty is not None
        assert drawn[name].uncertainty / entry.uncertainty == pytest.approx(1, abs=4 / math.sqrt(300)), name
        alone = math.sqrt(entry.uncertainty**2 - entry.shared[BEYOND] ** 2)
        assert drawn[name].uncertainty > 1.2 * alone, name
        assert drawn[name].agreement != "agrees"
    (said,) = [each for each in outcome.document.findings if each.code == "skewed"]
    assert "--monte-carlo" in (said.remedy or "")


def results(drawn: MonteCarlo) -> dict[str, MonteCarloResult]:
    """Return results by name."""
    return {each.name: each for each in drawn.results}


def product(**inputs: Estimate) -> Done:
    """Return the product of some numbers."""
    step = formula(lambda **x: (math.prod(x.values()),), list(inputs), ["y"])
    return worked([(step, {}, inputs, {"y": "y"})], [rectangular("flat")])


def test_a_source_is_one_draw_for_all_that_share_it() -> None:
    """2 x 3 with one relative source of 10 per cent: u = 1.2; were they drawn apart it would be 0.85."""
    (shared,) = monte_carlo(
        product(a=number(2.0, 0.2, "gain"), b=number(3.0, 0.3, "gain")).outcome, Request(2000)
    ).results
    (apart,) = monte_carlo(
        product(a=number(2.0, 0.2, "one"), b=number(3.0, 0.3, "other")).outcome, Request(2000)
    ).results
    assert shared.uncertainty == pytest.approx(1.2, rel=4 / math.sqrt(4000) + 0.01)
    assert apart.uncertainty == pytest.approx(0.6 * math.sqrt(2), rel=4 / math.sqrt(4000) + 0.01)


def test_a_rectangular_source_stays_within_its_limits() -> None:
    (found,) = monte_carlo(
        product(a=number(1.0, 1 / math.sqrt(3), "flat"), b=number(1.0, 0.0, "")).outcome, Request(2000)
    ).results
    assert 0 < found.symmetric[0] < found.symmetric[1] < 2
    # 2 x 0.95 wide, where a normal distribution is 2 x 1.13.
    assert found.symmetric[1] - found.symmetric[0] == pytest.approx(1.9, abs=0.03)


def test_equal_seeds_give_equal_bits_and_more_trials_begin_with_the_same() -> None:
    outcome = product(a=number(1.0, 0.1, "a"), b=number(1.0, 0.1, "b")).outcome
    first, again = monte_carlo(outcome, Request(300, seed=5)), monte_carlo(outcome, Request(300, seed=5))
    assert first == again
    assert first.model_dump_json() == again.model_dump_json()
    assert MonteCarlo.model_validate_json(first.model_dump_json()) == first
    other = monte_carlo(outcome, Request(300, seed=6))
    assert other.results[0].mean != first.results[0].mean


def _slope(_: Any, *, x: np.ndarray, y: np.ndarray, u_y: np.ndarray | None) -> Outcome:
    fit = straight_line(
        x, y, standard_uncertainty=u_y if u_y is not None and u_y.any() else None, absolute=False
    )
    k = fit.names.index("slope")
    covariance = np.asarray(fit.covariance)[k : k + 1, k : k + 1]
    return Outcome({"slope": fit.value("slope")}, covariance=Covariance(("slope",), covariance))


SLOPE = Step(
    name="slope", version=1, function=_slope, takes={"x": Port("any", "array", "x"), "y": Port("any", "array", "y")},
    yields={"slope": Port("number", "scalar", "slope")}, sentence="line", spread="refit", weights=("y",),
)  # fmt: skip


def line(*, stated: float, scatter: float) -> Done:
    """Return a straight line through 400 rows whose noise is stated rightly, wrongly or not at all."""
    x = np.linspace(0, 1, 400)
    y = x + scatter * np.random.default_rng(2).standard_normal(x.size)
    return worked(
        [(SLOPE, {}, {"x": column(x, 0.0, "number"), "y": column(y, stated, "number")}, {"slope": "slope"})]
    )


@pytest.mark.parametrize(
    ("stated", "share"),
    [pytest.param(0.01, 0.0, id="stated rightly"), pytest.param(0.004, 0.84, id="more scatter than stated"), pytest.param(0.0, 0.0, id="nothing stated")],
)  # fmt: skip
def test_scatter_is_drawn_once_whoever_states_it(stated: float, share: float) -> None:
    """A fit's covariance is what its rows scatter by, 0.01; it must be neither lost nor drawn on top of drawn noise."""
    done = line(stated=stated, scatter=0.01)
    drawn = monte_carlo(done.outcome, Request(800))
    u = float(done.estimates["slope"].uncertainty)
    assert u == pytest.approx(0.01 * math.sqrt(12 / 400), rel=0.15)
    assert results(drawn)["slope"].uncertainty == pytest.approx(u, rel=4 / math.sqrt(1600) + 0.05)
    # 1 - (0.004/0.01)^2; 200 repetitions know the noise's part of the variance to a tenth.
    assert drawn.beyond_noise.get("step 1 (slope)", 0.0) == pytest.approx(share, abs=0.05)


def test_trials_that_fail_are_counted_with_the_reason_and_spoil_no_other_result() -> None:
    def root(x: float) -> tuple[float]:
        if x < 0:
            raise ValueError(f"x: found {x:.3g}, expected 0 or more")
        return (math.sqrt(x),)

    steps = [
        (formula(root, ["x"], ["root"]), {}, {"x": number(1.0, 1.0, "x")}, {"root": "root"}),
        (formula(lambda z: (2 * z,), ["z"], ["twice"]), {}, {"z": "root"}, {"twice": "twice"}),
        (
            formula(lambda z: (3 * z,), ["z"], ["thrice"]),
            {},
            {"z": number(1.0, 0.1, "z")},
            {"thrice": "thrice"},
        ),
    ]
    drawn = monte_carlo(worked(steps).outcome, Request(1000))
    # 16 per cent of a normal distribution lie more than one standard deviation below the mean.
    assert drawn.failed == pytest.approx(159, abs=47)
    assert drawn.failures == {"step 1 (formula)": drawn.failed}
    assert "expected 0 or more" in drawn.reasons["step 1 (formula)"]
    lost = {name: 1000 - each.values for name, each in results(drawn).items()}
    assert lost == {"root": drawn.failed, "twice": drawn.failed, "thrice": 0}


def test_an_exact_number_is_left_out_and_nothing_to_draw_is_refused() -> None:
    done = worked([
        (formula(lambda x: (x, 7.0), ["x"], ["y", "seven"]), {}, {"x": number(1.0, 0.1, "x")}, {"y": "y", "seven": "seven"}),
    ])  # fmt: skip
    assert [each.name for each in monte_carlo(done.outcome, Request(50)).results] == ["y"]
    bare = worked(
        [
            (
                SLOPE,
                {},
                {"x": column(np.arange(5.0), 0.0, "number"), "y": column(np.arange(5.0) ** 2, 0.0, "number")},
                {},
            )
        ]
    )
    with pytest.raises(BadRequest, match="no result that is one number"):
        monte_carlo(bare.outcome, Request(50))


@pytest.mark.parametrize(
    "wrong", [{"trials": 1}, {"trials": 0}, {"trials": 10, "seed": -1}, {"trials": 10, "digits": 3}, {"trials": 10, "workers": 0}], ids=str
)  # fmt: skip
def test_requests_that_cannot_be_met(wrong: dict[str, int]) -> None:
    with pytest.raises(BadRequest):
        Request(**wrong)


def test_a_shipped_plan_can_be_sent_to_other_processes(laboratory: Any) -> None:
    """What a worker gets is the whole drawing; that numbers do not depend on workers is the door's test."""
    outcome = film(laboratory)
    for each in outcome.repeated.evaluations:
        again = pickle.loads(pickle.dumps(each.call))  # noqa: S301 - written here
        values = {port: estimate.value for port, estimate in each.estimates.items()}
        found = again(values, each.outcome.held)
        for name in each.outcome.outputs:
            np.testing.assert_array_equal(found.array(name), each.outcome.array(name))


def test_the_adaptive_procedure_stops_when_the_ends_are_known(monkeypatch: pytest.MonkeyPatch) -> None:
    """JCGM 101:2008, 7.9.4, with short sequences: two at least, and no more once twice the deviation is below the tolerance."""
    monkeypatch.setattr("archive.reduction.monte_carlo.BLOCK", 400)
    outcome = product(a=number(1.0, 0.1, "a"), b=number(1.0, 0.1, "b")).outcome
    coarse = monte_carlo(outcome, Request(None))
    assert coarse.adaptive
    assert coarse.trials >= 800
    assert coarse.trials % 400 == 0
    monkeypatch.setattr("archive.reduction.monte_carlo.MOST", 2000)
    fine = monte_carlo(outcome, Request(None, digits=2))
    # Two digits of 0.14 allow 0.005, which the ends of 400 draws miss by far: it goes on, and gives up where told.
    assert fine.trials == 2000
    # The same trials asked for by number say the same.
    repeated = monte_carlo(outcome, Request(coarse.trials))
    assert replace_adaptive(repeated) == coarse


def replace_adaptive(drawn: MonteCarlo) -> MonteCarlo:
    """Return a run as if the number of its trials had been found."""
    return drawn.model_copy(update={"adaptive": True})


def test_progress_tells_the_last_trial() -> None:
    told: list[tuple[int, int]] = []
    monte_carlo(
        product(a=number(1.0, 0.1, "a"), b=number(1.0, 0.1, "b")).outcome,
        Request(450),
        progress=lambda *at: told.append(at),
    )
    assert told[-1] == (450, 450)
    assert len(told) < 250
