"""What wrote a file: program, interpreter, platform and the packages that numbers depend on."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version

import archive
from schemas.lineage import Software

__all__ = ["software"]

_PACKAGES = ("h5py", "isal", "numpy", "pint", "pyarrow", "pydantic", "scipy", "sqlalchemy")


def software() -> Software:
    """Versions of everything that a stored number rests on."""
    packages = {}
    for name in _PACKAGES:
        try:
            packages[name] = version(name)
        except PackageNotFoundError:
            packages[name] = "unknown"
    return Software(
        stillroom=archive.__version__,
        python=platform.python_version(),
        platform=f"{platform.system()} {platform.machine()}",
        packages=packages,
    )
