"""Identifiers of persons, institutions, publications and licences, checked as far as a text can be.

A check digit that is right proves that nobody mistyped the identifier, not that anybody bears it.
"""

from __future__ import annotations

import re
from typing import Annotated

from pydantic import AfterValidator

__all__ = ["Doi", "Licence", "Orcid", "Ror", "doi", "is_listed_licence", "licence", "orcid", "ror"]

_ORCID = re.compile(r"(?:https?://orcid\.org/)?([0-9]{4})-?([0-9]{4})-?([0-9]{4})-?([0-9]{3}[0-9X])")
_ROR = re.compile(r"(?:https://)?ror\.org/(0([a-hj-km-np-tv-z0-9]{6})([0-9]{2}))")
_DOI = re.compile(r"(?:https://doi\.org/|doi:)?(10\.[0-9]{4,9}/[!-~]+)")
# An identifier of the SPDX list, or one of an own licence (SPDX specification 2.3, annex D: idstring, license-ref).
_LICENCE = re.compile(r"[A-Za-z0-9][A-Za-z0-9.+-]{0,99}")
_CROCKFORD = "0123456789abcdefghjkmnpqrstvwxyz"


def orcid(text: str) -> str:
    """Return an ORCID iD as its full address.

    Parameters
    ----------
    text : str
        Sixteen characters, with or without hyphens and ``https://orcid.org/``.

    Raises
    ------
    ValueError
        If it is none, or its check character is wrong.

    References
    ----------
    ISO/IEC 7064, MOD 11-2: from 0, add each digit and double; (12 - total mod 11) mod 11 is the last, 10 written X.

    Examples
    --------
    >>> orcid("0000-0002-1825-0097")
    'https://orcid.org/0000-0002-1825-0097'
    """
    match = _ORCID.fullmatch(text)
    if match is None:
        raise ValueError(
            "an ORCID iD has sixteen characters in groups of four, such as 0000-0002-1825-0097; found "
            + repr(text)
        )
    signs = "".join(match.groups())
    total = 0
    for digit in signs[:-1]:
        total = (total + int(digit)) * 2
    check = (12 - total % 11) % 11
    if signs[-1] != "0123456789X"[check]:
        raise ValueError(f"the check character of the ORCID iD {text} is wrong; look for a mistyped digit")
    return "https://orcid.org/" + "-".join(match.groups())


def ror(text: str) -> str:
    """Return a ROR identifier of an institution as its full address.

    Raises
    ------
    ValueError
        If it is none, or its check digits are wrong.

    References
    ----------
    Research Organization Registry, ROR identifier pattern: 0, six characters of base 32 (Crockford), two check digits
    98 - (100 n mod 97), ISO/IEC 7064 MOD 97-10.

    Examples
    --------
    >>> ror("https://ror.org/02mhbdp94")
    'https://ror.org/02mhbdp94'
    """
    match = _ROR.fullmatch(text)
    if match is None:
        raise ValueError(f"a ROR identifier looks like https://ror.org/02mhbdp94; found {text!r}")
    number = 0
    for sign in match[2]:
        number = number * 32 + _CROCKFORD.index(sign)
    if int(match[3]) != 98 - (number * 100) % 97:
        raise ValueError(
            f"the check digits of the ROR identifier {text} are wrong; look for a mistyped character"
        )
    return f"https://ror.org/{match[1]}"


def doi(text: str) -> str:
    """Return a DOI without the resolver before it.

    Raises
    ------
    ValueError
        If it is none.

    Examples
    --------
    >>> doi("https://doi.org/10.1103/PhysRevLett.40.1727")
    '10.1103/PhysRevLett.40.1727'
    """
    match = _DOI.fullmatch(text)
    if match is None:
        raise ValueError(f"a DOI looks like 10.1103/PhysRevLett.40.1727; found {text!r}")
    return match[1]


def licence(text: str) -> str:
    """Return an SPDX identifier of a licence unchanged.

    Raises
    ------
    ValueError
        If it cannot be one.

    Examples
    --------
    >>> licence("CC-BY-4.0")
    'CC-BY-4.0'
    """
    if _LICENCE.fullmatch(text) is None:
        raise ValueError(
            f"a licence is written as its SPDX identifier, such as CC-BY-4.0, or LicenseRef-NAME; found {text!r}"
        )
    return text


def is_listed_licence(text: str) -> bool:
    """Return whether a text has the form of an identifier of the SPDX list; a sheet may state a licence in words.

    Examples
    --------
    >>> is_listed_licence("CC-BY-4.0"), is_listed_licence("LicenseRef-ours"), is_listed_licence("ask the laboratory")
    (True, False, False)
    """
    return _LICENCE.fullmatch(text) is not None and not text.startswith("LicenseRef-")


Orcid = Annotated[str, AfterValidator(orcid)]
Ror = Annotated[str, AfterValidator(ror)]
Doi = Annotated[str, AfterValidator(doi)]
Licence = Annotated[str, AfterValidator(licence)]
