"""RO-Crate metadata of a package: what each file is, what was done, by what program, under which licence.

RO-Crate 1.1 with the Process Run Crate profile 0.5, which is built on it. Every reduction is an action of one program; the
plan that it carried out is among the things that it took.

References
----------
.. [1] P. Sefton et al., RO-Crate Metadata Specification 1.1, 2020.
.. [2] S. Leo et al., Recording provenance of workflow runs with RO-Crate, PLOS ONE 19 (2024) e0309210; Process Run Crate 0.5.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from typing import Any, Final

from archive.exchange.about import About
from archive.exchange.contents import plan_path, sealed_path
from archive.exchange.prov_names import program_identifier
from archive.exchange.sealed_document import SealedDocument
from schemas.deposit import Author
from schemas.identifiers import is_listed_licence
from schemas.lineage import AccessionDocument, ReductionDocument
from schemas.visible_text import json_escaped

__all__ = ["CRATE_NAME", "crate"]

CRATE_NAME: Final = "ro-crate-metadata.json"

_SPECIFICATION = "https://w3id.org/ro/crate/1.1"
_PROFILE = "https://w3id.org/ro/wfrun/process/0.5"
# The one term that is not in the context of RO-Crate 1.1; defined by the workflow run vocabulary [2].
_CONTEXT = [f"{_SPECIFICATION}/context", {"sha256": "https://w3id.org/ro/terms/workflow-run#sha256"}]
_MEDIA_TYPES = {
    ".h5": "application/x-hdf5", ".json": "application/json", ".provn": "text/provenance-notation", ".csv": "text/csv",
    ".toml": "application/toml", ".html": "text/html", ".pdf": "application/pdf", ".txt": "text/plain",
    ".tex": "application/x-tex", ".bib": "application/x-bibtex", ".cff": "application/yaml",
}  # fmt: skip
_FOLDERS = {
    "documents/": "What a sealed file says about itself, taken out of it",
    "sheets/": "Cooldown sheet, as the person wrote it",
    "plans/": "Plan of a reduction",
    "reports/": "Report made from the sealed files",
    "provenance/": "Provenance in the terms of W3C PROV",
}

Entity = dict[str, Any]


def crate(about: About, sealed: Sequence[SealedDocument], files: Mapping[str, tuple[int, str]]) -> str:
    """Return `ro-crate-metadata.json` of a package, with a line end.

    Parameters
    ----------
    about : About
        Title, description, date, authors, licences.
    sealed : sequence of SealedDocument
        In the order of recording.
    files : mapping of str to (int, str)
        Size and SHA-256 of every file of the package, by path; the crate's own file is not among them.
    """
    described = {sealed_path(each.key): each for each in sealed}
    parts = [_file(path, *files[path], described.get(path)) for path in sorted(files)]
    programs: dict[str, Entity] = {}
    holders = _holders(sealed)
    actions = [
        _action(each, each.document, files, programs, holders)
        for each in sealed
        if isinstance(each.document, ReductionDocument)
    ]
    people = [_person(number, author) for number, author in enumerate(about.authors, 1)]
    institutions = _institutions(about)
    licences = [_licence(number, each) for number, each in enumerate(about.licences, 1)] or [_no_licence()]
    root: Entity = {
        "@id": "./",
        "@type": "Dataset",
        "name": about.title,
        "description": about.description,
        "datePublished": about.issued.isoformat(),
        "conformsTo": {"@id": _PROFILE},
        "license": _one_or_many([_reference(each) for each in licences]),
        "hasPart": _one_or_many([_reference(each) for each in parts]),
    }
    optional: dict[str, Any] = {
        "author": [_reference(each) for each in people],
        "publisher": [{"@id": _institution_id(about.publisher, about.publisher_ror)}]
        if about.publisher
        else [],
        "keywords": [", ".join(about.keywords)] if about.keywords else [],
        "mentions": [_reference(each) for each in actions],
    }
    root |= {name: _one_or_many(values) for name, values in optional.items() if values}
    descriptor: Entity = {
        "@id": CRATE_NAME,
        "@type": "CreativeWork",
        "conformsTo": {"@id": _SPECIFICATION},
        "about": {"@id": "./"},
    }
    profile: Entity = {
        "@id": _PROFILE,
        "@type": "CreativeWork",
        "name": "Process Run Crate",
        "version": "0.5",
    }
    graph = [
        descriptor,
        root,
        profile,
        *licences,
        *people,
        *institutions,
        *programs.values(),
        *actions,
        *parts,
    ]
    return (
        json_escaped(
            json.dumps({"@context": _CONTEXT, "@graph": graph}, indent=1, ensure_ascii=False, allow_nan=False)
        )
        + "\n"
    )


def _reference(entity: Entity) -> Entity:
    return {"@id": entity["@id"]}


def _one_or_many(values: Sequence[Any]) -> Any:
    return values[0] if len(values) == 1 else list(values)


def _file(path: str, size: int, sha256: str, sealed: SealedDocument | None) -> Entity:
    suffix = path[path.rfind(".") :]
    folder = next((text for start, text in _FOLDERS.items() if path.startswith(start)), None)
    return {
        "@id": path,
        "@type": "File",
        "name": path.rpartition("/")[2] if sealed is None else sealed.address,
        "description": _description(sealed) if sealed is not None else (folder or _TOP.get(path, path)),
        "encodingFormat": _MEDIA_TYPES.get(suffix, "application/octet-stream"),
        "contentSize": str(size),
        "sha256": sha256,
    }


_TOP = {
    "README.txt": "What this package is and how to read it",
    "stillroom-package.json": "The sealed files of this package, their digests, and why each is here",
    "results.csv": "Every scalar result with its standard uncertainty",
    "datacite.json": "DataCite metadata, kernel 4",
    "CITATION.cff": "How to cite the data, Citation File Format 1.2.0",
}


def _description(sealed: SealedDocument) -> str:
    content = sealed.document
    if isinstance(content, AccessionDocument):
        return f"Sealed accession {content.address} of cooldown {content.cooldown}: {len(content.raw_files)} raw files verbatim, {len(content.sweeps)} sweeps"
    if isinstance(content, ReductionDocument):
        return f"Sealed reduction {content.address} by plan {content.plan.address}: {content.plan.title}"
    return f"Sealed document {sealed.address}, {sealed.format}"


def _action(
    sealed: SealedDocument,
    content: ReductionDocument,
    files: Mapping[str, tuple[int, str]],
    programs: dict[str, Entity],
    holders: Mapping[str, list[str]],
) -> Entity:
    """Return the action by which a reduction was made."""
    version = content.software.stillroom
    program = programs.setdefault(
        version,
        {
            "@id": program_identifier(version),
            "@type": "SoftwareApplication",
            "name": "Stillroom",
            "softwareVersion": version,
        },
    )
    heads = [content.sweep, *(entry.address.partition("#")[0] for entry in content.inputs)]
    taken = dict.fromkeys(path for head in heads for path in holders.get(head, ()))
    plan = plan_path(content)
    objects = [*taken, *([plan] if plan in files else [])]
    return {
        "@id": f"#reducing-{sealed.key.replace('/', '-').replace('@', '-')}",
        "@type": "CreateAction",
        "name": f"{content.plan.title}: {content.sweep}",
        "description": f"Plan {content.plan.address}, {len(content.steps)} steps; each stands in the provenance",
        "instrument": _reference(program),
        "object": _one_or_many([{"@id": path} for path in objects]),
        "result": {"@id": sealed_path(sealed.key)},
        "startTime": _moment(content.begin),
        "endTime": _moment(content.end),
        "actionStatus": "http://schema.org/CompletedActionStatus",
    }


def _holders(sealed: Sequence[SealedDocument]) -> dict[str, list[str]]:
    """Return the paths of the files that hold a sweep, an accession or a reduction, by its address."""
    found: dict[str, list[str]] = {}
    for each in sealed:
        content, path = each.document, sealed_path(each.key)
        found.setdefault(each.address, []).append(path)
        if isinstance(content, AccessionDocument):
            for entry in content.sweeps:
                found.setdefault(f"{content.cooldown}/{entry.name}", []).append(path)
    return found


def _moment(moment: datetime) -> str:
    # The profile's own check knows no "Z", and a fraction only of three digits.
    return moment.astimezone(UTC).isoformat(timespec="milliseconds" if moment.microsecond else "seconds")


def _person(number: int, author: Author) -> Entity:
    group = author.name is not None
    person: Entity = {
        "@id": author.orcid or f"#author-{number}",
        "@type": "Organization" if group else "Person",
        "name": author.name if group else " ".join(part for part in (author.given, author.family) if part),
    }
    if not group:
        person |= {"familyName": author.family} | ({"givenName": author.given} if author.given else {})
    if author.affiliation is not None:
        person["affiliation"] = {"@id": _institution_id(author.affiliation, author.affiliation_ror)}
    return person


def _institution_id(name: str, ror: str | None) -> str:
    plain = "".join(sign if sign.isascii() and sign.isalnum() else "-" for sign in name.lower())
    return ror or f"#institution-{plain}"


def _institutions(about: About) -> list[Entity]:
    named = [(author.affiliation, author.affiliation_ror) for author in about.authors]
    named.append((about.publisher, about.publisher_ror))
    found: dict[str, Entity] = {}
    for name, ror in named:
        if name is not None:
            identifier = _institution_id(name, ror)
            page = {"url": ror} if ror is not None else {}
            found.setdefault(identifier, {"@id": identifier, "@type": "Organization", "name": name, **page})
    return list(found.values())


def _licence(number: int, text: str) -> Entity:
    if is_listed_licence(text):
        identifier, what = (
            f"https://spdx.org/licenses/{text}.html",
            f"Licence with the SPDX identifier {text}",
        )
    else:
        identifier, what = (
            f"#licence-{number}",
            "Terms as the laboratory states them; ask whoever gave you this package",
        )
    return {"@id": identifier, "@type": "CreativeWork", "name": text, "description": what}


def _no_licence() -> Entity:
    return {
        "@id": "#no-licence-stated",
        "@type": "CreativeWork",
        "name": "No licence stated",
        "description": "Neither the cooldown sheets nor the archive state a licence; this package grants no right to use the data again.",
    }
