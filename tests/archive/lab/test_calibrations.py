"""A calibration made in the archive: as a record of a later sheet, held against its reduction, traced, and compared."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from archive import Archive
from archive.demo.calibration_cooldown import make_calibration_folders
from archive.demo.calibration_forward import germanium_resistance
from archive.errors import BadRequest, UnknownAddress
from archive.exchange.closure import needs_of
from archive.reduction import planning
from archive.reduction.calibration_comparison import compared
from archive.reduction.calibration_record import calibration_from, calibration_text
from archive.reduction.calibration_sources import temperature_contributions
from archive.reduction.thermometry_steps import calibrated_temperature
from schemas.lineage import ReductionDocument

MADE = "2024-11/c01@thermometer-calibration.1"

SHEET = """
format = "stillroom-cooldown/1"
name = "{name}"
cryostat = "CB-1"
begin = 2025-02-03T09:00:00+11:00
end = 2025-02-05T09:00:00+11:00
time_zone = "Australia/Hobart"
operators = ["graduate student"]
purpose = "Calibration of RX-8 against GE-7."
outcome = "complete"
temperature_scale = "ITS-90"

[gas_end]
state = "never-admitted"

[[record.thermometer]]
name = "RX-8"
revision = 1
kind = "ruthenium-oxide"
place = "plate"

{records}

[[sweep]]
name = "c01"
kind = "calibration"
files = ["c01.csv"]
thermometer = "reference"
calibrates = "resistance"
direction = "up"
[sweep.channels]
reference  = {{ column = "GE", quantity = "resistance", unit = "Ohm", uncertainty = "0.001 %", thermometer = "GE-7", calibration = "GE-7-cal" }}
resistance = {{ column = "RX", quantity = "resistance", unit = "Ohm", uncertainty = "0.002 %", thermometer = "RX-8" }}
"""


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive with the calibrations of 2024-11."""
    place = tmp_path_factory.mktemp("calibrations")
    (folder,) = make_calibration_folders(place / "folders", 1)
    with Archive.create(place / "lab", name="Test laboratory") as made:
        assert made.ingest(folder).state == "ingested"
        assert [each.problem for each in made.reduce("2024-11", sweep="c01")] == [None]
        yield made


def folder_of(path: Path, records: str, name: str = "2025-02") -> Path:
    """Write a cooldown in which RX-8 is calibrated against GE-7."""
    T = np.linspace(1.35, 4.1, 24)
    rng = np.random.default_rng(list(name.encode()))
    GE = germanium_resistance(T) * (1 + 1e-5 * rng.standard_normal(T.size))
    RX = 1450 * np.exp((2.1 / T) ** 0.345) * (1 + 2e-5 * rng.standard_normal(T.size))
    folder = path / name
    folder.mkdir(parents=True)
    (folder / "cooldown.toml").write_text(SHEET.format(name=name, records=records), encoding="utf-8")
    rows = "\n".join(f"{a:.5f},{b:.5f}" for a, b in zip(GE, RX, strict=True))
    (folder / "c01.csv").write_text(f"GE,RX\n{rows}\n", encoding="utf-8")
    return folder


@pytest.fixture(scope="module")
def text(lab: Archive) -> str:
    """Give the record of GE-7 as text."""
    return calibration_text(lab.calibration(MADE))


@pytest.fixture(scope="module")
def second(lab: Archive, text: str, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """Give the reduction of a later cooldown that uses the record."""
    outcome = lab.ingest(folder_of(tmp_path_factory.mktemp("second"), text))
    assert outcome.state == "ingested"
    assert [f.code for f in outcome.report.findings if f.severity != "note"] == []
    (reduced,) = lab.reduce("2025-02")
    assert reduced.problem is None
    assert reduced.document is not None
    return {"address": reduced.address, "document": reduced.document}


def test_the_text_comes_back_bit_for_bit(lab: Archive, text: str) -> None:
    (table,) = tomllib.loads(text)["record"]["calibration"]
    record = lab.calibration(MADE)
    assert tuple(table["relation"]["coefficients"]) == record.coefficients
    assert (record.name, record.revision, record.thermometer, record.made_from) == ("GE-7-cal", 1, "GE-7", MADE)  # fmt: skip
    assert [each["source"] for each in table["contribution"]] == [each.source for each in record.contribution]
    # Fit and reference together are the covariance of the coefficients that the reduction sealed.
    shifts = np.array([each["coefficients"] for each in table["contribution"] if " fit " in each["source"]])
    (fitted,) = lab.show(MADE)["covariances"].values()
    np.testing.assert_allclose(shifts.T @ shifts, fitted["matrix"], rtol=1e-6, atol=1e-18)


def test_its_temperatures_carry_the_sources_of_the_calibration(second: dict[str, Any]) -> None:
    names = {each.name for each in second["document"].sources}
    assert {"gain of gauge G3 in 2024-11", "equation of thermal transpiration", "GE-7-cal.r1 interpolation", f"{MADE} fit 0"} <= names  # fmt: skip
    outputs = {each.name: each for each in second["document"].outputs}
    gain = outputs["temperature_high"].shared["gain of gauge G3 in 2024-11"]
    assert abs(gain) == pytest.approx(
        2e-4 * 4.1 / 6, rel=0.5
    )  # dT/T = (dp/p)/(d ln p/d ln T), about 4 to 6 here
    assert outputs["temperature_high"].uncertainty > abs(gain)


def test_a_trace_leads_through_the_calibration_to_its_raw_lines(lab: Archive, second: dict[str, Any]) -> None:
    lines = list(lab.trace(f"{second['address']}#temperature_high").lines())
    at = next(k for k, line in enumerate(lines) if "GE-7-cal.r1, calibration" in line)
    below = [
        line
        for line in lines[at + 1 :]
        if len(line) - len(line.lstrip()) > len(lines[at]) - len(lines[at].lstrip())
    ]
    assert any(f"{MADE}#coefficients" in line for line in below)
    assert any("2024-11.a1:raw/germanium.csv, data from line 3" in line for line in below)


def test_what_rests_on_the_raw_file_of_a_calibration_is_found_through_it(lab: Archive, second: dict[str, Any]) -> None:  # fmt: skip
    lines = list(lab.trace("2024-11.a1:raw/germanium.csv", forward=True).lines())
    at = next(k for k, line in enumerate(lines) if "GE-7-cal.r1, calibration" in line)
    assert any(f"{second['address']}#temperature_high" in line for line in lines[at:])


def test_a_record_that_was_changed_is_told(lab: Archive, text: str, tmp_path: Path) -> None:
    (first,) = [line for line in text.splitlines() if line.startswith("relation")]
    changed = text.replace(first, first.replace("coefficients = [0.7", "coefficients = [0.8"))
    report = lab.check(folder_of(tmp_path, changed, "2025-03-a"))
    found = {f.code: f for f in report.findings}
    assert found["calibration-differs"].severity == "error"
    assert "relation differs" in found["calibration-differs"].what
    narrower = text.replace("temperature_low = ", 'temperature_low = "1.32 K" # ')
    assert "calibration-differs" not in {
        f.code for f in lab.check(folder_of(tmp_path, narrower, "2025-03-b")).findings
    }
    lower = text.replace("temperature_low = ", 'temperature_low = "1.2 K" # ')
    report = lab.check(folder_of(tmp_path, lower, "2025-03-d"))
    assert "temperature_low differs" in next(f.what for f in report.findings if f.code == "calibration-differs")  # fmt: skip
    wider = text.replace("temperature_high = ", 'temperature_high = "4.3 K" # ')
    report = lab.check(folder_of(tmp_path, wider, "2025-03-c"))
    assert "temperature_high differs" in next(
        f.what for f in report.findings if f.code == "calibration-differs"
    )


def test_a_record_from_nowhere_is_told(lab: Archive, text: str, tmp_path: Path) -> None:
    wrong = text.replace(f'made_from = "{MADE}"', 'made_from = "2023-01/c01@thermometer-calibration.1"')
    found = {f.code: f for f in lab.check(folder_of(tmp_path, wrong)).findings}
    assert found["calibration-not-archived"].severity == "error"
    assert (
        "there is no reduction 2023-01/c01@thermometer-calibration.1"
        in found["calibration-not-archived"].what
    )


@pytest.mark.usefixtures("second")
def test_drift_is_told_in_millikelvin_and_warned_of(lab: Archive, text: str, tmp_path: Path) -> None:
    same = text.replace("revision = 1", "revision = 2").replace("date = 2024-11-06", "date = 2025-06-01")
    report = lab.check(folder_of(tmp_path, same, "2025-06-a"))
    assert "calibration-drift" not in {f.code for f in report.findings}
    content = {
        "name": "GE-7-cal", "revision": 2, "thermometer": "GE-7", "scale": "ITS-90", "date": "2025-06-01", "against": "a certificate",
        "reading_unit": "kOhm",
    }  # fmt: skip
    record = lab.calibration(MADE)
    first, *rest = record.coefficients or ()
    # Two millikelvin in a kelvin, in other units, and from elsewhere.
    relation = f'{{ form = "log-polynomial", centre = {record.relation.centre - np.log(1e3)}, half_width = {record.relation.half_width}, coefficients = {[first + 2e-3, *rest]} }}'  # type: ignore[union-attr]
    lines = [f"{key} = {value!r}" if isinstance(value, int) else f'{key} = "{value}"' for key, value in content.items()]  # fmt: skip
    lines = [
        *lines,
        f"relation = {relation}",
        'temperature_low = "1.3 K"',
        'temperature_high = "4.2 K"',
        'uncertainty = "0.1 mK"',
        "readings = [0.115, 0.617]",
        'changed = "Mounted again."',
    ]
    moved = "[[record.calibration]]\n" + "\n".join(lines).replace('"2025-06-01"', "2025-06-01") + "\n"
    found = {f.code: f for f in lab.check(folder_of(tmp_path, moved, "2025-06-b")).findings}
    assert found["calibration-drift"].severity == "warning"
    assert "more than GE-7-cal.r1" in found["calibration-drift"].what
    assert lab.ingest(tmp_path / "2025-06-b").state == "ingested"
    (drift,) = lab.calibration_drift("GE-7")
    assert drift.found is not None
    np.testing.assert_allclose(drift.found.difference / drift.found.temperature, 2e-3, rtol=2e-3)
    other = moved.replace("revision = 2", "revision = 3").replace('"ITS-90"', '"local:lab"').replace("2025-06-01", "2025-07-01")  # fmt: skip
    found = {f.code: f for f in lab.check(folder_of(tmp_path, other, "2025-07")).findings}
    assert found["calibration-not-compared"].severity == "note"
    assert "local:lab" in found["calibration-not-compared"].what


def test_what_is_no_calibration_is_refused(lab: Archive, second: dict[str, Any]) -> None:
    with pytest.raises(UnknownAddress, match="no reduction"):
        lab.calibration("2024-11/c09@thermometer-calibration.1")
    with pytest.raises(BadRequest, match="CB-1 is the name of another record"):
        lab.calibration(second["address"], name="CB-1")
    with pytest.raises(UnknownAddress, match="expected one of: GE-7"):
        lab.calibration_drift("XX-1")
    assert lab.calibration(second["address"]).name == "RX-8-cal"


@pytest.mark.usefixtures("second")
def test_an_accession_rests_on_the_reduction_behind_its_calibration(lab: Archive) -> None:
    """So that a package of it takes the calibration's rows along."""
    assert MADE in needs_of(lab._source.accession("2025-02.a1"))
    assert MADE not in needs_of(lab._source.accession("2024-11.a1"))


@pytest.mark.parametrize("form", ["chebyshev", "spline"])
def test_another_form_is_a_record_too(lab: Archive, form: str, tmp_path: Path) -> None:
    shipped = (Path(planning.__file__).parent / "plans" / "thermometer-calibration.toml").read_text(encoding="utf-8")  # fmt: skip
    own = shipped.replace('name = "thermometer-calibration"', f'name = "my-{form}"').replace(
        'use = "calibration-fit"\n', f'use = "calibration-fit"\nset = {{ form = "{form}" }}\n'
    )
    (tmp_path / "plan.toml").write_text(own, encoding="utf-8")
    (outcome,) = lab.reduce("2024-11", sweep="c01", plan=tmp_path / "plan.toml")
    assert outcome.problem is None
    record = lab.calibration(outcome.address or "", revision=7)
    assert (record.relation.form, record.address) == (form, "GE-7-cal.r7")
    T = np.linspace(1.4, 4.1, 15)
    reading = germanium_resistance(T)
    found = calibrated_temperature(record, reading, 1.0)
    u = np.sqrt(sum(part**2 for _, part in temperature_contributions(record, reading, found)))
    # The errors of the demonstration's laboratory are drawn once: all 15 lie on one side.
    assert np.all(np.abs(found - T) < 3.5 * u)
    drift = compared(lab.calibration(MADE), record)
    assert drift.found is not None
    assert drift.found.significance < 4


class Changed:
    """An archive in which one reduction reads otherwise."""

    def __init__(self, lab: Archive, document: ReductionDocument) -> None:
        self._source, self._document = lab._source, document

    def reduction(self, address: str) -> ReductionDocument:
        """Return the changed reduction."""
        return self._document

    def __getattr__(self, name: str) -> Any:
        """Return everything else as it is."""
        return getattr(self._source, name)


def without(document: ReductionDocument, what: str) -> ReductionDocument:
    """Return a reduction that lacks its fit, an output, or its scale."""
    if what == "fit":
        return document.model_copy(update={"steps": document.steps[:-1]})
    if what == "output":
        return document.model_copy(
            update={"outputs": tuple(each for each in document.outputs if each.name != "centre")}
        )
    return document.model_copy(
        update={"outputs": tuple(each.model_copy(update={"scale": None}) for each in document.outputs)}
    )


@pytest.mark.parametrize(
    ("what", "sentence"),
    [("fit", "fits no calibration"), ("output", "keeps no centre"), ("scale", "on no named scale")],
)
def test_a_reduction_that_lacks_what_a_record_needs_is_refused(lab: Archive, what: str, sentence: str) -> None:  # fmt: skip
    document = without(lab._source.reduction(MADE), what)
    with pytest.raises(BadRequest, match=sentence):
        calibration_from(MADE, Changed(lab, document), name="x", revision=1)  # type: ignore[arg-type]


NO_CALIBRATION = """
[sweep.channels]
reference  = {{ column = "GE", quantity = "temperature", unit = "K", scale = "ITS-90" }}
resistance = {{ column = "RX", quantity = "resistance", unit = "Ohm"{thermometer} }}
"""


def test_a_reference_that_is_a_temperature_needs_no_calibration(lab: Archive, tmp_path: Path) -> None:
    for name, thermometer in (("2025-08", ', thermometer = "RX-8"'), ("2025-09", "")):
        folder = folder_of(tmp_path, "", name)
        sheet = (folder / "cooldown.toml").read_text(encoding="utf-8")
        sheet = sheet[: sheet.index("[sweep.channels]")] + NO_CALIBRATION.format(thermometer=thermometer)
        (folder / "cooldown.toml").write_text(sheet, encoding="utf-8")
        T = np.linspace(1.4, 4.0, 20) + 1e-4 * len(name + thermometer)
        rows = "\n".join(f"{t:.6f},{1450 * np.exp((2.1 / t) ** 0.345):.5f}" for t in T)
        (folder / "c01.csv").write_text(f"GE,RX\n{rows}\n", encoding="utf-8")
        outcome = lab.ingest(folder)
        assert outcome.state == "ingested"
        missing = [f for f in outcome.report.findings if f.code == "calibrated-thermometer-missing"]
        assert bool(missing) == (thermometer == "")
        (reduced,) = lab.reduce(name)
        if missing:
            with pytest.raises(BadRequest, match="does not say which thermometer its channel resistance reads"):  # fmt: skip
                lab.calibration(reduced.address or "")
        else:
            record = lab.calibration(reduced.address or "")
            assert record.against == "temperatures of channel reference in 2025-08/c01"


def test_a_record_may_come_in_alone_and_goes_stale_with_its_reduction(tmp_path: Path) -> None:
    (folder,) = make_calibration_folders(tmp_path / "folders", 2)
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        assert lab.ingest(folder).state == "ingested"
        assert [each.problem for each in lab.reduce("2024-11", sweep="c01")] == [None]
        head = 'format = "stillroom-revision/1"\nby = "data steward"\n'
        text = calibration_text(lab.calibration(MADE))
        changed = tmp_path / "changed.toml"
        changed.write_text(head + text.replace("interpolation_uncertainty = ", "interpolation_uncertainty = 1e-3 # "), encoding="utf-8")  # fmt: skip
        (fault,) = lab.revise(changed).findings
        assert "interpolation_uncertainty" in fault.what
        changed.write_text(head + text.replace("@thermometer-calibration.1\"", "@thermometer-calibration.9\"", 1), encoding="utf-8")  # fmt: skip
        (fault,) = lab.revise(changed).findings
        assert "there is no reduction" in fault.what
        (tmp_path / "alone.toml").write_text(head + text, encoding="utf-8")
        assert lab.revise(tmp_path / "alone.toml").state == "sealed"
        # The next sheet names the record without describing it.
        assert lab.ingest(folder_of(tmp_path, "")).state == "ingested"
        (reduced,) = lab.reduce("2025-02")
        assert reduced.problem is None
        assert lab.stale() == []
        lab.withdraw(MADE, why="the gauge had been read wrongly", by="data steward")
        (found,) = [each for each in lab.stale() if each.reduction == reduced.address]
        assert any("calibration GE-7-cal.r1 was made from it" in reason.text for reason in found.reasons)


def test_a_channel_under_calibration_must_exist(lab: Archive, tmp_path: Path) -> None:
    folder = folder_of(tmp_path, "", "2025-10")
    sheet = (folder / "cooldown.toml").read_text(encoding="utf-8")
    (folder / "cooldown.toml").write_text(sheet.replace('calibrates = "resistance"', 'calibrates = "resitance"'), encoding="utf-8")  # fmt: skip
    found = [f for f in lab.check(folder).findings if f.code == "unknown-name" and "resitance" in f.what]
    assert found[0].expected == "one of reference, resistance"
