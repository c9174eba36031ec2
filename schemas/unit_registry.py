"""The one pint registry of the process, asked only for names of the allow-list.

Rules
-----
* pint is loaded at the first question, so that importing the schemas stays quick.
* The registry's disk cache only saves time; whatever is wrong with it, the answer is the same.
* The cache holds pickles, which can run code: it is used only where nobody else can write, whatever the umask was.
"""

from __future__ import annotations

import os
import pickle
import stat
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any

__all__ = ["Dimension", "root"]

Dimension = tuple[tuple[str, int], ...]
"""Sorted pairs of an SI base dimension (as pint names it, without brackets) and its exponent; ``angle`` counts as one."""

DEFINITIONS = (
    # SI Brochure, 2.3.1: the Avogadro constant is exactly 6.02214076e23 per mole.
    "stillroom_atom = mole / 6.02214076e23",
    # 13595.1 kg/m3 x 9.80665 m/s2 x 1 mm, the conventional millimetre of mercury at 0 C.
    "stillroom_mercury = 133.322387415 * pascal",
    # n = p V / (R T) of an ideal gas at 273.15 K, R = 8.31446261815324 J/(mol K) exactly (CODATA 2022).
    "stillroom_stp_atm = 101325e-6 / 8.31446261815324 / 273.15 * mole",
    "stillroom_stp_bar = 100000e-6 / 8.31446261815324 / 273.15 * mole",
)

# The SI and pint give the radian no dimension; counting it here keeps Hz from rad/s and N m from N m/rad.
_ANGLES = frozenset({"radian", "degree"})


@cache
def root(name: str) -> tuple[Fraction, Dimension]:
    """Return factor to coherent SI and dimension of one unprefixed unit, as pint defines it."""
    if not name:
        return Fraction(1), ()
    quantity = _registry().Quantity(1, name).to_base_units()
    if name in _ANGLES:
        return Fraction(quantity.magnitude), (("angle", 1),)
    dims = tuple((base.strip("[]"), int(power)) for base, power in quantity.dimensionality.items())
    return Fraction(quantity.magnitude), dims


# What reading a missing, half-written or foreign pickle can raise, and a folder that cannot be written.
_CACHE_FAULTS = (
    OSError,
    EOFError,
    pickle.UnpicklingError,
    AttributeError,
    ImportError,
    LookupError,
    TypeError,
    ValueError,
)


def _is_private(folder: Path) -> bool:
    """Return whether nobody else can have put a file here; on Windows the user's own profile sees to that."""
    if not hasattr(os, "getuid"):  # pragma: no cover - the other system
        return True
    about = folder.lstat()
    return stat.S_ISDIR(about.st_mode) and about.st_uid == os.getuid() and not about.st_mode & 0o022


@cache
def _registry() -> Any:
    """Return the one pint registry of the process, from its disk cache where there is one."""
    import pint
    from platformdirs import user_cache_path

    def built(folder: str | None) -> Any:
        # Fractions keep decimal prefixes exact; pint's own floats give 1 umol = 9.999...e-7 mol on some paths.
        registry: Any = pint.UnitRegistry(cache_folder=folder, non_int_type=Fraction)
        for definition in DEFINITIONS:
            registry.define(definition)
        return registry

    try:
        folder = user_cache_path("stillroom") / f"units-{pint.__version__}"
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        return built(str(folder) if _is_private(folder) else None)
    except _CACHE_FAULTS:
        # The cache only saves time: a folder that cannot be written, or a file another process is just
        # writing, must not stop anybody.
        return built(None)
