"""Two-scale-factor combination."""

from __future__ import annotations

import pytest

from archive.physics.two_scale_factor import two_scale_factor

A = 5.6537
"""J/(mol K), A below the transition: Lipa, Nissen, Stricker, Swanson, Chui, Phys. Rev. B 68, 174518 (2003), from memory."""


@pytest.mark.parametrize(
    ("angstrom", "R"), [(3.45, 0.8500), (3.43, 0.8451), (3.1, 0.764)], ids=["3.45", "3.43", "3.1"]
)
def test_lengths(angstrom, R):
    """Computed twice by hand with V = 27.38 cm^3/mol; about 0.85 is observed (common practice, no source)."""
    found = float(two_scale_factor(angstrom * 1e-10, heat_capacity_amplitude=A, molar_volume=27.38e-6))
    assert found == pytest.approx(R, abs=6e-5 if R > 0.8 else 5e-4)


def test_cube_root():
    one, eight = two_scale_factor(3e-10, heat_capacity_amplitude=[1.0, 8.0], molar_volume=27.4e-6)
    assert eight / one == pytest.approx(2.0, rel=1e-14)


@pytest.mark.parametrize("name", ["length_amplitude", "heat_capacity_amplitude", "molar_volume"])
def test_refused(name):
    arguments = {
        "length_amplitude": 3.4e-10,
        "heat_capacity_amplitude": A,
        "molar_volume": 27.4e-6,
        name: 0.0,
    }
    with pytest.raises(ValueError, match=name):
        two_scale_factor(arguments.pop("length_amplitude"), **arguments)
