"""Hard ranges: refused with name, index, value and range; NaN passes."""

import numpy as np
import pytest

from archive.physics.ranges import floats, within


def test_values_inside_pass_unchanged() -> None:
    values = within([1.0, 2.0, np.nan], "T", low=1.0, high=2.0, unit="K", formula="a law")
    np.testing.assert_array_equal(values, [1.0, 2.0, np.nan])


def test_scalar_is_named_without_index() -> None:
    with pytest.raises(ValueError, match=r"^p = 3 Pa is outside the range 1 to 2 Pa of a law; do else$"):
        within(3.0, "p", low=1, high=2, unit="Pa", formula="a law", hint="do else")


def test_first_index_of_a_table_and_the_count_are_named() -> None:
    with pytest.raises(ValueError, match=r"T\[1, 0\] = 9 K .*\(and 2 more values\)"):
        within([[1.5, 1.5], [9.0, 0.5], [1.5, -1.0]], "T", low=1, high=2, unit="K", formula="a law")


def test_floats_accepts_integers() -> None:
    assert floats(3).dtype == np.float64


def test_a_pure_number_has_no_unit_in_the_message() -> None:
    with pytest.raises(ValueError, match=r"^x = 3 is outside the range 0 to 1 of a law$"):
        within(3.0, "x", low=0, high=1, unit="", formula="a law")
