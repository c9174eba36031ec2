"""Records for those who catalogue the data and those who cite them: DataCite JSON and CITATION.cff.

Neither is written without authors and a publisher; nothing stands in for a name that was not given.

References
----------
.. [1] DataCite Metadata Working Group, DataCite Metadata Schema 4.5, 2024.
.. [2] S. Druskat et al., Citation File Format 1.2.0, 2021.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

from archive.exchange.about import About
from schemas.deposit import Author
from schemas.identifiers import is_listed_licence
from schemas.visible_text import json_escaped

__all__ = ["citation_cff", "datacite_json"]

_SPDX = "https://spdx.org/licenses/"
_MEDIA_TYPES = ("application/x-hdf5", "application/json", "text/csv")
# Licences that people put on data; of these it is known that the format's own list [2] has them.
_LISTED = {"CC0-1.0", "CC-BY-4.0", "CC-BY-SA-4.0", "CC-BY-NC-4.0", "ODbL-1.0", "ODC-By-1.0", "PDDL-1.0"}


def datacite_json(about: About, addresses: Sequence[str]) -> str:
    """Return DataCite metadata of a data set as JSON, with a line end.

    Parameters
    ----------
    about : About
        With authors and publisher.
    addresses : sequence of str
        Addresses of the sealed files, kept as alternate identifiers of the archive's own.

    Raises
    ------
    ValueError
        If authors or publisher are not stated.

    Notes
    -----
    The DOI is given by whoever publishes the data; it is not in here.
    """
    if not about.citable or about.publisher is None:
        raise ValueError("about: authors and publisher must be stated")
    publisher: dict[str, Any] = {"name": about.publisher}
    if about.publisher_ror is not None:
        publisher |= {
            "publisherIdentifier": about.publisher_ror,
            "publisherIdentifierScheme": "ROR",
            "schemeUri": "https://ror.org",
        }
    dates = [{"date": about.issued.isoformat(), "dateType": "Issued"}]
    if about.collected is not None:
        first, last = about.collected
        dates.append({"date": f"{first.isoformat()}/{last.isoformat()}", "dateType": "Collected"})
    record: dict[str, Any] = {
        "types": {"resourceTypeGeneral": "Dataset", "resourceType": "Low-temperature measurements"},
        "creators": [_creator(author) for author in about.authors],
        "titles": [{"title": about.title}],
        "publisher": publisher,
        "publicationYear": str(about.issued.year),
        "dates": dates,
        "descriptions": [{"description": about.description, "descriptionType": "Abstract"}],
        "sizes": [f"{about.size} bytes"],
        "formats": list(_MEDIA_TYPES),
        "alternateIdentifiers": [
            {"alternateIdentifier": address, "alternateIdentifierType": "address in the laboratory's archive"}
            for address in addresses
        ],
        "schemaVersion": "http://datacite.org/schema/kernel-4",
    }
    if about.licences:
        record["rightsList"] = [_rights(each) for each in about.licences]
    if about.keywords:
        record["subjects"] = [{"subject": word} for word in dict.fromkeys(about.keywords)]
    if about.supplement_to:
        record["relatedIdentifiers"] = [
            {"relatedIdentifier": doi, "relatedIdentifierType": "DOI", "relationType": "IsSupplementTo"}
            for doi in dict.fromkeys(about.supplement_to)
        ]
    if about.funder is not None:
        award = {} if about.award is None else {"awardNumber": about.award}
        record["fundingReferences"] = [{"funderName": about.funder, **award}]
    return json_escaped(json.dumps(record, indent=1, ensure_ascii=False, allow_nan=False)) + "\n"


def _creator(author: Author) -> dict[str, Any]:
    made: dict[str, Any] = {
        "name": author.shown,
        "nameType": "Organizational" if author.name is not None else "Personal",
    }
    if author.family is not None:
        made |= {"familyName": author.family} | ({"givenName": author.given} if author.given else {})
    if author.orcid is not None:
        made["nameIdentifiers"] = [
            {
                "nameIdentifier": author.orcid,
                "nameIdentifierScheme": "ORCID",
                "schemeUri": "https://orcid.org",
            }
        ]
    if author.affiliation is not None:
        place: dict[str, Any] = {"name": author.affiliation}
        if author.affiliation_ror is not None:
            place |= {
                "affiliationIdentifier": author.affiliation_ror,
                "affiliationIdentifierScheme": "ROR",
                "schemeUri": "https://ror.org",
            }
        made["affiliation"] = [place]
    return made


def _rights(identifier: str) -> dict[str, str]:
    if not is_listed_licence(identifier):
        return {"rights": identifier}
    return {
        "rights": identifier,
        "rightsUri": f"{_SPDX}{identifier}.html",
        "rightsIdentifier": identifier,
        "rightsIdentifierScheme": "SPDX",
        "schemeUri": _SPDX,
    }


def citation_cff(about: About) -> str:
    """Return `CITATION.cff` of a data set.

    Raises
    ------
    ValueError
        If authors or publisher are not stated.

    Notes
    -----
    Every text is written in double quotes with the escapes of JSON, which YAML 1.2 reads in the same way.
    """
    if not about.citable:
        raise ValueError("about: authors and publisher must be stated")
    lines = [
        "cff-version: 1.2.0",
        f"message: {_quoted('If you use these data, please cite them as below.')}",
        "type: dataset",
        f"title: {_quoted(about.title)}",
        f"abstract: {_quoted(about.description)}",
        "authors:",
        *(line for author in about.authors for line in _author(author)),
    ]
    # A list of licences would leave the choice to the reader; several cooldowns may have one each.
    if len(about.licences) == 1 and about.licences[0] in _LISTED:
        lines.append(f"license: {about.licences[0]}")
    lines.append(f"date-released: {about.issued.isoformat()}")
    if about.keywords:
        lines += ["keywords:", *(f"  - {_quoted(word)}" for word in dict.fromkeys(about.keywords))]
    return "\n".join([*lines, ""])


def _author(author: Author) -> list[str]:
    if author.name is not None:
        return [f"  - name: {_quoted(author.name)}"]
    fields = {
        "family-names": author.family,
        "given-names": author.given,
        "affiliation": author.affiliation,
        "orcid": author.orcid,
    }
    written = [f"{name}: {_quoted(value)}" for name, value in fields.items() if value is not None]
    return [f"  {'-' if place == 0 else ' '} {line}" for place, line in enumerate(written)]


def _quoted(text: str) -> str:
    return json_escaped(json.dumps(text, ensure_ascii=False))
