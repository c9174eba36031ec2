"""Two calibrations of one thermometer: what they share cancels, what they do not adds."""

from __future__ import annotations

import numpy as np
import pytest
from GTC import ureal

from archive.physics.calibration_drift import calibration_difference


def test_the_uncertainty_of_a_difference_is_that_of_gtc() -> None:
    """Oracle: GTC's uncertain numbers with one shared input."""
    shared, first, second = ureal(0.0, 2e-3), ureal(0.0, 1e-3), ureal(0.0, 5e-4)
    difference = (1.2 + 1.5 * shared + second) - (1.0 + shared + first)
    found = calibration_difference(
        [1.0],
        [1.2],
        earlier_parts={"reference": [2e-3], "fit": [1e-3]},
        later_parts={"reference": [3e-3], "another fit": [5e-4]},
    )
    assert found.difference[0] == pytest.approx(difference.x)
    assert found.uncertainty[0] == pytest.approx(difference.u, rel=1e-12)
    assert found.significance == pytest.approx(difference.x / difference.u)


def test_what_moves_both_alike_cancels() -> None:
    found = calibration_difference(
        [1.0, 2.0],
        [1.0, 2.001],
        earlier_parts={"scale": [1e-3, 2e-3]},
        later_parts={"scale": [1e-3, 2e-3]},
    )
    assert found.uncertainty.tolist() == [0.0, 0.0]
    assert found.significance == np.inf
    assert found.worst == 1


@pytest.mark.parametrize(("earlier", "later"), [([], []), ([1.0], [1.0, 2.0]), (1.0, 1.0)])
def test_nothing_to_compare_is_refused(earlier: object, later: object) -> None:
    with pytest.raises(ValueError, match="with at least one temperature"):
        calibration_difference(earlier, later, earlier_parts={}, later_parts={})  # type: ignore[arg-type]
