"""What wrote a reduction: versions of Stillroom, Python, and the libraries whose rounding is in the numbers."""

from __future__ import annotations

import platform
from functools import cache
from importlib import metadata

from schemas.lineage import Software

__all__ = ["software"]

PACKAGES = ("numpy", "scipy", "pint", "pydantic", "h5py")
"""Libraries that can change a number or the reading of one."""


@cache
def software() -> Software:
    """Return the versions in use; what is imported does not change while a process runs."""
    return Software(
        stillroom=metadata.version("stillroom"),
        python=platform.python_version(),
        platform=f"{platform.system()} {platform.machine()}",
        packages={name: metadata.version(name) for name in PACKAGES},
    )
