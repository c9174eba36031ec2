"""What a package says about itself, and the readable files that stand beside the sealed ones.

::

    stillroom-package.json      the sealed files with their digests and why each is there
    sealed/<key>.h5             as they lie in the archive, byte for byte
    documents/<key>.json        what each says about itself, taken out of it
    sheets/<address>.toml       the sheet of an accession, amendment or revision, as the person wrote it
    plans/<plan>.json           the plans that were carried out
    results.csv                 every scalar result
    provenance/<cooldown>.*     PROV-JSON and PROV-N of each cooldown and all that it rests on

All of it follows from the sealed files alone, so that a package made again from an import of it is the same.
"""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable, Iterator, Sequence
from typing import Literal

from pydantic import Field, ValidationError

from archive.errors import DamagedFile
from archive.exchange.closure import ASKED, Holdings, behind
from archive.exchange.prov_lineage import Lineage
from archive.exchange.prov_notations import prov_json, prov_n
from archive.exchange.sealed_document import SealedDocument
from archive.exchange.withdrawn import reasons_of_withdrawal
from schemas.acts import AmendmentDocument, RevisionDocument
from schemas.base import Record
from schemas.lineage import AccessionDocument, ReductionDocument, Sha256
from schemas.visible_text import visible

__all__ = [
    "PACKAGE_NAME",
    "PackageDocument",
    "PackedFile",
    "package_document",
    "read_package",
    "sealed_path",
    "sidecars",
]

PACKAGE_NAME = "stillroom-package.json"


_COLUMNS = (
    "address",
    "quantity",
    "value",
    "standard_uncertainty",
    "unit",
    "scale",
    "words",
    "description",
    "withdrawn_because",
)


class PackedFile(Record):
    """One sealed file of a package."""

    key: str = Field(description="Its name in a store.")
    path: str = Field(description="Where it lies in the package.")
    address: str
    format: str = Field(description="Format of its document.")
    sha256: Sha256
    size: int = Field(ge=0)
    because: str = Field(description="Why it is here: asked for, or what rests on it.")


class PackageDocument(Record):
    """`stillroom-package.json`."""

    format: Literal["stillroom-package/1"]
    asked: tuple[str, ...] = Field(
        description="Addresses that were asked for; none when it is a whole archive."
    )
    files: tuple[PackedFile, ...] = Field(
        min_length=1, description="In an order in which they can be recorded."
    )


def sealed_path(key: str) -> str:
    """Return where a sealed file lies in a package.

    Examples
    --------
    >>> sealed_path("2026-03/s017@film-transition.2")
    'sealed/2026-03/s017@film-transition.2.h5'
    """
    return f"sealed/{key}.h5"


def package_document(asked: Sequence[str], sealed: Sequence[SealedDocument]) -> PackageDocument:
    """Return what a package says about itself."""
    files = tuple(
        PackedFile(
            key=each.key,
            path=sealed_path(each.key),
            address=each.address,
            format=each.format,
            sha256=each.sha256,
            size=each.size,
            because=each.because,
        )
        for each in sealed
    )
    return PackageDocument(format="stillroom-package/1", asked=tuple(asked), files=files)


def read_package(text: str) -> PackageDocument:
    """Return a package's account of itself.

    Raises
    ------
    DamagedFile
        If the text is none.
    """
    try:
        return PackageDocument.model_validate_json(text)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        raise DamagedFile(
            "the package does not say what it holds",
            file=f"data/{PACKAGE_NAME}",
            field=".".join(map(str, first["loc"])) or None,
            found=str(first["msg"]),
            remedy="it was written by another version of Stillroom, or is no package of an archive",
        ) from None


def sidecars(
    asked: Sequence[str],
    sealed: Sequence[SealedDocument],
    *,
    text: Callable[[str], str],
    raw: Callable[[str, str], Iterator[bytes]],
) -> Iterator[tuple[str, bytes]]:
    """Yield the readable files beside the sealed ones: path and content, each path once.

    Parameters
    ----------
    asked : sequence of str
        Addresses that were asked for.
    sealed : sequence of SealedDocument
        In the order of recording.
    text : callable
        Text of the document inside a key's file.
    raw : callable
        Bytes of a raw file inside a key's file, by its name.
    """
    yield PACKAGE_NAME, (package_document(asked, sealed).model_dump_json(indent=1) + "\n").encode()
    yield "results.csv", _results(sealed).encode()
    plans: set[str] = set()
    for each in sealed:
        yield f"documents/{each.key}.json", (text(each.key).rstrip("\n") + "\n").encode()
        content = each.document
        if isinstance(content, AccessionDocument):
            if content.sheet_file in {entry.name for entry in content.raw_files}:
                yield f"sheets/{content.address}.toml", b"".join(raw(each.key, content.sheet_file))
        elif isinstance(content, RevisionDocument | AmendmentDocument):
            yield f"sheets/{content.address}.toml", b"".join(raw(each.key, content.sheet_file))
        elif isinstance(content, ReductionDocument) and (path := plan_path(content)) not in plans:
            plans.add(path)
            plan = json.dumps(content.plan.model_dump(mode="json"), indent=1, ensure_ascii=False) + "\n"
            yield path, plan.encode()
    yield from _provenance(sealed)


def plan_path(content: ReductionDocument) -> str:
    """Return where the plan of a reduction lies in a package."""
    return f"plans/{content.plan.address}.{content.plan_digest[:12]}.json"


def _provenance(sealed: Sequence[SealedDocument]) -> Iterator[tuple[str, bytes]]:
    """Yield the provenance of each cooldown with all that it rests on, in both notations."""
    by_key = {each.key: each for each in sealed}
    holdings = Holdings(by_key, lambda key: by_key[key].document)
    cooldowns = sorted(
        {each.cooldown for item in sealed if isinstance(each := item.document, AccessionDocument)}
    )
    for cooldown in cooldowns:
        keys = behind(dict.fromkeys(holdings.folder(cooldown), ASKED), holdings)
        document = Lineage([by_key[key] for key in keys]).document
        yield f"provenance/{cooldown}.prov.json", prov_json(document).encode()
        yield f"provenance/{cooldown}.provn", prov_n(document).encode()


def _results(sealed: Sequence[SealedDocument]) -> str:
    """Return every scalar result as comma-separated values by RFC 4180, numbers with all their digits."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream, lineterminator="\r\n")
    writer.writerow(_COLUMNS)
    withdrawn = reasons_of_withdrawal(sealed)
    for each in sealed:
        content = each.document
        if not isinstance(content, ReductionDocument):
            continue
        why = next(
            (
                withdrawn[name]
                for name in (each.address, content.sweep, content.cooldown)
                if name in withdrawn
            ),
            "",
        )
        for entry in content.outputs:
            if entry.rows is None:
                numbers = [
                    "" if number is None else repr(number) for number in (entry.value, entry.uncertainty)
                ]
                words = [
                    _no_formula(visible(text))
                    for text in (entry.scale or "", entry.verdict or "", entry.description, why)
                ]
                writer.writerow(
                    [f"{each.address}#{entry.name}", entry.quantity, *numbers, entry.unit, *words]
                )
    return stream.getvalue()


def _no_formula(text: str) -> str:
    # A spreadsheet must not take a text for a formula.
    return f"'{text}" if text.lstrip().startswith(("=", "+", "-", "@")) else text
