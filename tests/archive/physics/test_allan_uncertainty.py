"""The uncertainty of an Allan deviation against simulated white noise, and against what one can count by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.allan_deviation import allan_deviation
from archive.physics.allan_uncertainty import relative_uncertainty


def test_by_hand():
    """Three readings averaged singly: two differences with correlation -1/2, relative variance of the square (2/4)(2 + 2/4) = 5/4."""
    assert relative_uncertainty(3, 1) == pytest.approx(math.sqrt(5 / 4) / 2, rel=1e-12)
    # One difference: the variance of the square of one normal value is twice its square.
    assert relative_uncertainty(20, 10) == pytest.approx(math.sqrt(2) / 2, rel=1e-12)


@pytest.mark.parametrize("factor", [1, 4, 16])
def test_white_noise_scatters_by_as_much(factor):
    """Relative scatter of the squared deviation over 400 records; half of it is that of the deviation."""
    rng = np.random.default_rng(11)
    records = 1 + 1e-6 * rng.normal(size=(400, 128))
    squares = [float(allan_deviation(each, interval=1.0, factors=[factor]).sigma[0]) ** 2 for each in records]
    found = np.std(squares) / np.mean(squares) / 2
    # 400 draws fix a width of a skewed distribution to about a tenth.
    assert found == pytest.approx(relative_uncertainty(128, factor), rel=0.15)


@pytest.mark.parametrize("factor", [0, 11], ids=["none", "longer than half"])
def test_refused(factor):
    with pytest.raises(ValueError, match="factor"):
        relative_uncertainty(20, factor)
