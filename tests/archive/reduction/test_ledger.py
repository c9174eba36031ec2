"""The gas ledger agrees with the step and with calculation by hand."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest

from archive.reduction.facts import GasBook
from archive.reduction.gas_steps import VapourParameters, amount_from_doses, vapour_in_dead_volume
from archive.reduction.ledger import amount_after, gas_ledger
from archive.reduction.step import NoParameters
from schemas.cooldown import CooldownSheet
from schemas.quantity import Quantity
from schemas.substrate import Sample

SAMPLE = Sample(name="gas", revision=1, isotope="4He", gas_source="invented")


def _sheet(content: dict[str, Any]) -> CooldownSheet:
    return CooldownSheet.model_validate_json(json.dumps(content))


def _dose(name: str, day: int, **more: Any) -> dict[str, Any]:
    return {"name": name, "at": f"2026-03-{day:02d}T10:00:00+02:00", **more}


def test_one_dose_is_the_published_test_vector(tools: Any) -> None:
    # 10.000 cm^3 at 295.00 K and 100 Torr hold 54.35226 umol with B = 11.86 cm^3/mol; 0.5 cm^3/mol more or less in
    # B is 3 parts in 1e6, and 54.35577 umol would be the ideal gas.
    content = tools.sheet_content()
    content["doser"] = [{"name": "V1", "volume": "10.000 cm^3", "how": "given"}]
    content["gauge"] = []
    content["dose"] = [
        _dose(
            "d1",
            3,
            doser="V1",
            pressure_before="100 Torr",
            pressure_after="0 Pa",
            temperature_before="295.00 K",
        )
    ]
    content["sweep"] = content["sweep"][:1]
    entry = gas_ledger(_sheet(content), sample=SAMPLE).entries[0]
    assert entry.amount.value == pytest.approx(54.35226e-6, rel=5e-6)
    assert entry.method.startswith("V (rho(p1)")


def test_crossed_out_removed_and_recovered(tools: Any) -> None:
    content = tools.sheet_content()
    content["dose"] = [
        _dose("d1", 3, amount="10.0(1) umol"),
        _dose("d2", 4, amount="5.0(1) umol", crossed_out="valve leaked"),
        _dose("d3", 5, amount="2.0(1) umol", act="remove"),
        _dose("d4", 6, amount="7.9(1) umol", act="recover"),
    ]
    content["sweep"] = content["sweep"][:1]
    found = gas_ledger(_sheet(content), sample=None, area=Quantity.parse("2.0 m^2", "area"))
    assert [entry.counted for entry in found.entries] == [True, False, True, True]
    assert [entry.running_amount.value for entry in found.entries] == pytest.approx(
        [10e-6, 10e-6, 8e-6, 0.1e-6]
    )
    assert found.entries[2].running_coverage is not None
    assert found.entries[2].running_coverage.value == pytest.approx(4e-6)
    assert (found.admitted.value, found.removed.value, found.recovered.value) == pytest.approx(
        (10e-6, 2e-6, 7.9e-6)
    )
    assert found.balance.uncertainty == pytest.approx(0.1e-6 * 3**0.5)
    after = amount_after(_sheet(content), "d3", sample=None)
    assert float(after.value) == pytest.approx(8e-6)


def test_the_volume_of_the_doser_is_common_to_all_doses(tools: Any) -> None:
    sheet = _sheet(tools.sheet_content())
    last = amount_after(sheet, "d16", sample=SAMPLE)
    first = amount_after(sheet, "d01", sample=SAMPLE)
    volume = "volume of doser V1, 50.00(10) cm^3"
    assert float(last.shared[volume]) == pytest.approx(16 * float(first.shared[volume]), rel=1e-9)
    assert float(last.value) == pytest.approx(16 * tools.truth["dose"], rel=1e-4)
    # By hand: 0.2 % of volume, 0.1 % of gain, 0.3 K in 295 K, and 0.2 Pa in each of 32 readings of 300 Pa steps.
    by_hand = np.sqrt(0.002**2 + 0.001**2 + (0.3 / 295) ** 2 + 32 * (0.2 / 300 / 16) ** 2)
    assert float(last.uncertainty / last.value) == pytest.approx(by_hand, rel=0.01)


def test_step_and_ledger_agree(tools: Any, reduced: Any) -> None:
    amount = reduced.output("2026-03/f1@film-transition.1", "amount")
    ledger = gas_ledger(_sheet(tools.sheet_content()), sample=SAMPLE)
    assert float(amount.value) == ledger.entries[-1].running_amount.value
    assert float(amount.uncertainty) == pytest.approx(
        ledger.entries[-1].running_amount.uncertainty, rel=1e-12
    )


def _book(tools: Any) -> GasBook:
    sheet = _sheet(tools.sheet_content())
    return GasBook("2026-03", sheet.dose, sheet.doser, sheet.gauge, sheet.dead_volume, admitted="d16")


def test_vapour_at_a_measured_pressure_follows_the_gas_law(tools: Any) -> None:
    T = np.array([1.0, np.nan])
    found = vapour_in_dead_volume(
        VapourParameters(), gas=_book(tools), temperature=T, pressure=np.array([1.0, 1.0]), sample=SAMPLE
    )
    # p V/(R T) for 1 Pa in 0.5 cm^3 at 1 K; the virial term is 6e-5 of it.
    assert found.array("vapour")[0] == pytest.approx(0.5e-6 / 8.314462618, rel=1e-4)
    assert np.isnan(found.array("vapour")[1])


def test_vapour_without_a_pressure_is_half_the_bound(tools: Any) -> None:
    found = vapour_in_dead_volume(
        VapourParameters(), gas=_book(tools), temperature=np.array([1.5]), pressure=None, sample=SAMPLE
    )
    # Saturated vapour at 1.5 K holds 38.2137 umol/cm^3.
    assert found.array("vapour")[0] == pytest.approx(38.2137e-6 * 0.5 / 2, rel=2e-3)
    with pytest.raises(ValueError, match="none was measured"):
        vapour_in_dead_volume(
            VapourParameters(without_pressure="refuse"),
            gas=_book(tools),
            temperature=np.array([1.5]),
            pressure=None,
            sample=SAMPLE,
        )


def test_a_run_of_doses_without_times_is_refused(tools: Any) -> None:
    sheet = _sheet(tools.sheet_content())
    book = GasBook("2026-03", sheet.dose, sheet.doser, sheet.gauge, during=("d01",))
    with pytest.raises(ValueError, match="no channel gives the time"):
        amount_from_doses(NoParameters(), gas=book, sample=SAMPLE, time=None)
