"""`README.txt` of a package: what a person who has nothing else needs to know."""

from __future__ import annotations

from collections.abc import Sequence

from archive.exchange.about import About
from archive.exchange.sealed_document import SealedDocument
from archive.exchange.withdrawn import reasons_of_withdrawal
from schemas.visible_text import visible

__all__ = ["readme"]

_TEXT = """\
{title}
{line}

{description}

What is here
------------
sealed/               HDF5 files, byte for byte as they lie in the archive that made this package. Each holds raw files
                      verbatim under raw/, measured channels under sweeps/ or reduced arrays under arrays/, with units and
                      descriptions as attributes, and one JSON document about itself under document.
documents/            these JSON documents, taken out
sheets/               the cooldown sheets, as persons wrote them
plans/                the plans by which the data were reduced
results.csv           every scalar result with its standard uncertainty
provenance/           how each number came about: PROV-JSON and PROV-N (W3C, 2013)
reports/              run sheets and, if asked for, the methods appendix
stillroom-package.json, ro-crate-metadata.json
                      the list of all this for programs

How to read it
--------------
Any HDF5 tool opens the sealed files: built-in filters, no links, nothing hidden. In Python, with h5py:

    import h5py
    with h5py.File("{example}") as file:
        print(bytes(file["document"][0]).decode())

The folder above this one is a bag (RFC 8493): its manifests hold a SHA-256 and a SHA-512 of every file here, so that

    sha512sum -c manifest-sha512.txt

proves without any other program that nothing changed. `stillroom import` takes the package into another archive.

Rights
------
{rights}
{missing}{withdrawn}
Sealed files
------------
{files}
"""


def readme(about: About, sealed: Sequence[SealedDocument], example: str) -> str:
    """Return the text.

    Parameters
    ----------
    about : About
    sealed : sequence of SealedDocument
    example : str
        Path of a sealed file in the package.
    """
    rights = (
        "Licence: " + ", ".join(about.licences)
        if about.licences
        else "No licence is stated; this package grants no right to use the data again."
    )
    missing = "".join(f"\nNot stated: {each}" for each in about.missing)
    reasons = reasons_of_withdrawal(sealed)
    withdrawn = "".join(f"{target}: {' '.join(why.split())}\n" for target, why in sorted(reasons.items()))
    width = max(len(each.address) for each in sealed)
    text = _TEXT.format(
        title=about.title,
        line="=" * len(about.title),
        description=about.description,
        example=example,
        rights=rights,
        missing=f"{missing}\n" if missing else "",
        withdrawn=f"\nWithdrawn; it stays, and is not to be relied on\n{'-' * 47}\n{withdrawn}"
        if withdrawn
        else "",
        files="\n".join(f"{each.address:<{width}}  {each.size:>10} bytes  {each.because}" for each in sealed),
    )
    return visible(text)
