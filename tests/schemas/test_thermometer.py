"""Records of thermometers: where a tube belongs, and a laboratory's own scale in the text of a quantity."""

from __future__ import annotations

import json

import pytest
from pydantic import ValidationError

from schemas.quantity import Quantity
from schemas.sweep import Sweep
from schemas.thermometer import Thermometer

TUBE = {"inner_diameter": "2 mm", "warm_temperature": "295 K on ITS-90"}


def test_a_local_scale_is_read_after_the_unit() -> None:
    stated = Quantity.parse("9.65(9) mK on local:mixing-chamber", "temperature")
    assert (stated.scale, stated.unit) == ("local:mixing-chamber", "mK")


@pytest.mark.parametrize(("kind", "fits"), [("vapour-pressure-4He", True), ("germanium", False)])
def test_only_a_vapour_pressure_thermometer_has_a_tube(*, kind: str, fits: bool) -> None:
    content = json.dumps({"name": "X", "revision": 1, "kind": kind, "place": "plate", "tube": TUBE})
    if fits:
        assert Thermometer.model_validate_json(content).tube is not None
    else:
        with pytest.raises(ValidationError, match="only a vapour pressure thermometer has a tube"):
            Thermometer.model_validate_json(content)


@pytest.mark.parametrize(
    ("more", "sentence"),
    [
        pytest.param({"kind": "log", "thermometer": "p"}, "belongs to a sweep of kind", id="kind"),
        pytest.param({"kind": "calibration"}, "names the reference", id="no reference"),
        pytest.param({"kind": "calibration", "thermometer": "r"}, "another channel", id="itself"),
    ],
)
def test_a_calibration_needs_a_reference(more: dict[str, str], sentence: str) -> None:
    content = {"name": "c01", "files": ["a.csv"], "layout": "a", "calibrates": "r", **more}
    with pytest.raises(ValidationError, match=sentence):
        Sweep.model_validate_json(json.dumps(content))
