"""Who made the data and who makes them available: what a laboratory states for packages that leave it.

Nothing of this is invented when it is not stated; what cannot be written without it is left out and named.
"""

from __future__ import annotations

from typing import Annotated

from pydantic import Field, StringConstraints, model_validator

from schemas.base import Record
from schemas.identifiers import Doi, Licence, Orcid, Ror

__all__ = ["Author", "Deposit"]

_Line = Annotated[str, StringConstraints(pattern=r"^[^\x00-\x1f\x7f]+$", max_length=400)]


class Author(Record):
    """One author of the data: a person, or a group under one name."""

    family: _Line | None = Field(default=None, description="Family name of a person.")
    given: _Line | None = Field(default=None, description="Given names of a person.")
    name: _Line | None = Field(default=None, description="Name of a group, instead of family and given.")
    orcid: Orcid | None = Field(default=None, description="ORCID iD of a person, e.g. 0000-0002-1825-0097.")
    affiliation: _Line | None = Field(default=None, description="Institution, as a publication names it.")
    affiliation_ror: Ror | None = Field(default=None, description="ROR identifier of the institution.")

    @model_validator(mode="after")
    def _person_or_group(self) -> Author:
        if (self.family is None) == (self.name is None):
            raise ValueError(
                "an author has a family name (and given), or the name of a group; give one of both"
            )
        if self.name is not None and (self.given is not None or self.orcid is not None):
            raise ValueError("a group has no given name and no ORCID iD; write family and given for a person")
        if self.affiliation_ror is not None and self.affiliation is None:
            raise ValueError("affiliation_ror needs the affiliation that it stands for")
        return self

    @property
    def shown(self) -> str:
        """Name as a list of authors prints it: family first."""
        if self.name is not None:
            return self.name
        return str(self.family) + (f", {self.given}" if self.given else "")


class Deposit(Record):
    """`[exchange]` in `stillroom.toml`."""

    author: tuple[Author, ...] = Field(
        default=(), description="Authors of the data, in their order: [[exchange.author]]."
    )
    publisher: _Line | None = Field(
        default=None, description="Who makes the data available: a laboratory or repository."
    )
    publisher_ror: Ror | None = Field(default=None, description="ROR identifier of the publisher.")
    licence: Licence | None = Field(
        default=None, description="SPDX identifier of the licence of cooldowns whose sheet states none."
    )
    keywords: tuple[_Line, ...] = Field(default=(), description="Words under which the data are to be found.")
    supplement_to: tuple[Doi, ...] = Field(
        default=(), description="DOIs of the publications that rest on the data."
    )
    funder: _Line | None = Field(default=None, description="Name of the body that paid.")
    award: _Line | None = Field(default=None, description="Its number of the grant.")

    @model_validator(mode="after")
    def _stands_for_something(self) -> Deposit:
        for extra, named in (("publisher_ror", "publisher"), ("award", "funder")):
            if getattr(self, extra) is not None and getattr(self, named) is None:
                raise ValueError(f"{extra} needs the {named} that it stands for")
        return self
