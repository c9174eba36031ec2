"""Identifiers with check digits, and the people of a deposit."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from pydantic import ValidationError

from schemas.deposit import Author, Deposit
from schemas.identifiers import doi, licence, orcid, ror


@pytest.mark.parametrize(
    ("text", "found"),
    [
        # Example iDs of the ORCID documentation, "Structure of the ORCID Identifier".
        ("0000-0002-1825-0097", "https://orcid.org/0000-0002-1825-0097"),
        ("https://orcid.org/0000-0002-1694-233X", "https://orcid.org/0000-0002-1694-233X"),
        ("0000000218250097", "https://orcid.org/0000-0002-1825-0097"),
    ],
)
def test_an_orcid_in_any_spelling_becomes_its_address(text: str, found: str) -> None:
    assert orcid(text) == found


@pytest.mark.parametrize("place", range(15))
def test_a_wrong_digit_of_an_orcid_is_noticed(place: int) -> None:
    """MOD 11-2 notices every single wrong digit (ISO/IEC 7064)."""
    signs = list("0000000218250097")
    signs[place] = str((int(signs[place]) + 1) % 10)
    with pytest.raises(ValueError, match="check character"):
        orcid("".join(signs))


def test_exchanged_digits_of_an_orcid_are_noticed() -> None:
    with pytest.raises(ValueError, match="check character"):
        orcid("0000-0002-1852-0097")


@pytest.mark.parametrize("text", ["https://ror.org/02mhbdp94", "ror.org/05dxps055"])
def test_a_ror_identifier_becomes_its_address(text: str) -> None:
    assert ror(text).startswith("https://ror.org/0")


@pytest.mark.parametrize(
    ("read", "text"),
    [
        (orcid, "0000-0002-1825-009"),
        (orcid, "http://elsewhere.org/0000-0002-1825-0097"),
        (orcid, "0000-0002-1825-0097\n"),
        (orcid, "０000-0002-1825-0097"),
        (ror, "https://ror.org/02mhbdp95"),
        (ror, "https://ror.org/02mhbip94"),
        (ror, "02mhbdp94"),
        (doi, "11.1103/x"),
        (doi, "10.1103/"),
        (doi, "10.1103/x y"),
        (licence, "CC BY 4.0"),
        (licence, ""),
        (licence, "CC-BY-4.0 OR MIT"),
    ],
)
def test_what_is_none_is_refused(read: Callable[[str], str], text: str) -> None:
    with pytest.raises(ValueError, match=r"found|wrong"):
        read(text)


def test_a_doi_loses_its_resolver() -> None:
    assert doi("doi:10.1103/PhysRevLett.40.1727") == doi("https://doi.org/10.1103/PhysRevLett.40.1727")


@pytest.mark.parametrize(
    "fields",
    [
        {},
        {"family": "A", "name": "B"},
        {"name": "B", "orcid": "0000-0002-1825-0097"},
        {"name": "B", "given": "C"},
        {"family": "A", "affiliation_ror": "https://ror.org/02mhbdp94"},
        {"family": "A\n"},
    ],
    ids=["nobody", "both", "group with iD", "group with given name", "institution without name", "line end"],
)
def test_an_author_is_a_person_or_a_group(fields: dict[str, Any]) -> None:
    with pytest.raises(ValidationError):
        Author(**fields)


def test_what_stands_for_something_needs_it() -> None:
    with pytest.raises(ValidationError, match="needs the publisher"):
        Deposit(publisher_ror="https://ror.org/02mhbdp94")
    with pytest.raises(ValidationError, match="needs the funder"):
        Deposit(award="1")


def test_names_as_lists_of_authors_print_them() -> None:
    shown = [Author(family="B", given="A").shown, Author(family="B").shown, Author(name="G").shown]
    assert shown == ["B, A", "B", "G"]
