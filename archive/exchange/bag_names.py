"""Which paths a bag may hold, and how a manifest spells them.

A path in a bag from elsewhere is untrusted: it must lead nowhere but into the bag, and mean the same on every file system.

References
----------
.. [1] J. Kunze et al., The BagIt File Packaging Format (V1.0), RFC 8493, October 2018, sections 2.1.3, 5.1 and 6.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Iterator

__all__ = ["decoded", "encoded", "look_alikes", "path_fault"]

_CODES = {"%": "%25", "\n": "%0A", "\r": "%0D"}
_SIGNS = {"25": "%", "0A": "\n", "0D": "\r"}
_PERCENT = re.compile(r"%(.{0,2})", re.DOTALL)
# Windows keeps these names for devices, whatever the suffix ("Naming Files, Paths, and Namespaces", Microsoft).
_DEVICES = {"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(10))}
_FOREIGN = set('<>:"|?*\\')
_LONGEST_PATH, _LONGEST_PART, _DEEPEST = 1000, 255, 40


def encoded(path: str) -> str:
    """Return a path as a manifest spells it: percent sign, carriage return and line feed encoded, nothing else [1].

    Examples
    --------
    >>> encoded("data/50%.csv")
    'data/50%25.csv'
    """
    return "".join(_CODES.get(sign, sign) for sign in path)


def decoded(text: str) -> str:
    """Return the path that a manifest spells.

    Raises
    ------
    ValueError
        If a percent sign encodes something else than the three signs that may be encoded [1].

    Examples
    --------
    >>> decoded("data/50%25.csv")
    'data/50%.csv'
    """

    def sign(match: re.Match[str]) -> str:
        try:
            return _SIGNS[match[1].upper()]
        except KeyError:
            raise ValueError(
                f"{match[0]!r} encodes no sign that a manifest may encode (%25, %0A, %0D)"
            ) from None

    return _PERCENT.sub(sign, text)


def path_fault(path: str) -> str | None:
    """Return what is wrong with a path, as the rest of a sentence; None if nothing is.

    Examples
    --------
    >>> path_fault("data/sealed/2026-03/2026-03.a1.h5")
    >>> path_fault("data/../../etc/passwd")
    'climbs out of its folder'
    """
    parts = path.split("/")
    checks = (
        (path == "", "is empty"),
        (path.startswith(("/", "~")), "is not relative"),
        (".." in parts, "climbs out of its folder"),
        (any(part in ("", ".") for part in parts), "has an empty part"),
        (
            any(unicodedata.category(sign) in ("Cc", "Cf", "Cs", "Co", "Cn") for sign in path),
            "holds signs that cannot be seen",
        ),
        (any(sign in _FOREIGN for sign in path), "holds a sign that not every file system takes"),
        (any(part.endswith((".", " ")) for part in parts), "has a part that ends in a dot or a blank"),
        (any(part.split(".")[0].lower() in _DEVICES for part in parts), "has the name of a device"),
        (unicodedata.normalize("NFC", path) != path, "is not in Unicode normal form C"),
        (
            len(path) > _LONGEST_PATH
            or len(parts) > _DEEPEST
            or any(len(p.encode("utf-8", "replace")) > _LONGEST_PART for p in parts),
            "is too long",
        ),
    )
    return next((sentence for wrong, sentence in checks if wrong), None)


def look_alikes(paths: Iterable[str]) -> Iterator[tuple[str, str]]:
    """Yield pairs of paths, or of folders on their way, that a file system may take for one another."""
    seen: dict[str, str] = {}
    for path in sorted(set(paths)):
        parts = path.split("/")
        for depth in range(1, len(parts) + 1):
            place = "/".join(parts[:depth])
            folded = unicodedata.normalize("NFC", unicodedata.normalize("NFKC", place).casefold())
            first = seen.setdefault(folded, place)
            if first != place:
                yield first, place
