"""What a relative tolerance means where numbers are in SI units.

`pytest.approx` allows 1e-12 of any unit where no absolute tolerance is given. An atom has 7e-27 kg and a film 4e-8 kg/m^2: a check of such
a number by a relative tolerance would be none, or a loose one. Here the allowance is 1e-12 of the largest number that is expected.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import pytest

__all__ = ["relative_tolerances"]

_APPROX = pytest.approx


def _largest(expected: Any) -> float:
    values = list(expected.values()) if isinstance(expected, dict) else expected
    try:
        size = np.abs(np.asarray(values, dtype=np.complex128))
    except (TypeError, ValueError):
        return 1.0
    return float(np.max(size, where=np.isfinite(size), initial=0.0))


def _approx(expected: Any, rel: Any = None, abs: Any = None, nan_ok: bool = False) -> Any:  # noqa: FBT001, FBT002 - as in pytest
    largest = _largest(expected)
    if abs is None and 0 < largest < 1:
        abs = 1e-12 * largest
    return _APPROX(expected, rel=rel, abs=abs, nan_ok=nan_ok)


@pytest.fixture(scope="module", autouse=True)
def relative_tolerances() -> Iterator[None]:
    """Let `pytest.approx` take its absolute tolerance from the size of what is expected."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(pytest, "approx", _approx)
        yield
