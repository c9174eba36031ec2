"""What has to be true of a package before any of it is taken in: its account, its documents, and what they rest on."""

from __future__ import annotations

from collections.abc import Mapping

from archive.exchange.bag_reading import Bag, blocks_of
from archive.exchange.closure import Holdings, address_of_key
from archive.exchange.contents import PACKAGE_NAME, PackageDocument, PackedFile, read_package, sealed_path
from archive.store.names import is_key
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["account", "document_faults", "fault", "unmet_needs"]


def account(bag: Bag) -> PackageDocument | None:
    """Return the package's account of itself, compared with the bag; None, with findings in the bag, if they differ."""
    path = f"data/{PACKAGE_NAME}"
    if path not in bag.payload:
        bag.blame(
            "package-account",
            "this bag is no package of an archive",
            path,
            expected="a bag made by: stillroom export",
        )
        return None
    text = b"".join(blocks_of(bag.folder / path)).decode("utf-8", "replace")
    document = read_package(text)
    listed = {f"data/{each.path}" for each in document.files}
    for each in document.files:
        _compare(bag, each)
    for other in sorted(
        path for path in bag.payload if path.startswith("data/sealed/") and path not in listed
    ):
        bag.blame("package-account", "a sealed file that the package does not account for", other)
    keys = [each.key for each in document.files]
    for twice in sorted({key for key in keys if keys.count(key) > 1}):
        bag.blame("package-account", "the package accounts for this file twice", path, place=twice)
    return None if bag.findings else document


def _compare(bag: Bag, each: PackedFile) -> None:
    name = f"data/{PACKAGE_NAME}"
    if not is_key(each.key) or each.path != sealed_path(each.key):
        bag.blame("package-account", "no sealed file can have this name", name, found=ascii(each.key)[:200])
        return
    held = bag.payload.get(f"data/{each.path}")
    if held is None:
        bag.blame(
            "bag-file-missing",
            "a sealed file that the package accounts for is not there",
            f"data/{each.path}",
        )
    elif held != (each.size, {**held[1], "sha256": each.sha256}):
        bag.blame(
            "package-account",
            "the package accounts for other bytes than it holds",
            f"data/{each.path}",
            expected=f"{each.size} bytes, sha256 {each.sha256}",
            found=f"{held[0]} bytes, sha256 {held[1]['sha256']}",
        )
    if each.address != address_of_key(each.key):
        bag.blame(
            "package-account",
            "the address is not that of the file's name",
            name,
            place=each.key,
            found=each.address,
        )


def document_faults(key: str, document: Record, digests: Mapping[str, str]) -> list[Finding]:
    """Return where a sealed file and the document inside it contradict each other.

    Parameters
    ----------
    key : str
    document : Record
    digests : mapping of str to str
        SHA-256 of each dataset of the file, by path.
    """
    file = f"data/{sealed_path(key)}"
    found: list[Finding] = []
    says = str(getattr(document, "address", ""))
    if says != address_of_key(key):
        found.append(
            fault(
                "package-document",
                "the document says that it is another",
                file,
                expected=address_of_key(key),
                found=says,
            )
        )
    cooldown = getattr(document, "cooldown", None)
    if cooldown is not None and cooldown != key.partition("/")[0]:
        found.append(
            fault("package-document", "the document is of another cooldown", file, found=str(cooldown))
        )
    promised: dict[str, str] = {}
    if isinstance(document, AccessionDocument):
        promised = {f"raw/{each.name}": each.sha256 for each in document.raw_files}
        promised |= {
            f"sweeps/{sweep.name}/{channel.name}": channel.digest
            for sweep in document.sweeps
            for channel in sweep.channels
        }
    elif isinstance(document, ReductionDocument):
        promised = {f"arrays/{each.name}": each.digest for each in document.outputs if each.rows is not None}
    for path, digest in promised.items():
        if digests.get(path) != digest:
            found.append(
                fault(
                    "package-document",
                    f"the document promises other content of {path}",
                    file,
                    expected=digest,
                    found=digests.get(path, "nothing of that name"),
                )
            )
    return found


def fault(
    code: str,
    what: str,
    file: str,
    *,
    place: str | None = None,
    expected: str | None = None,
    found: str | None = None,
    remedy: str | None = None,
) -> Finding:
    """Return a fault of a package as a finding."""
    return Finding(
        code=code,
        severity="error",
        what=what,
        file=file,
        place=place,
        expected=expected,
        found=found,
        remedy=remedy,
    )


def unmet_needs(documents: Mapping[str, Record], holdings: Holdings) -> list[Finding]:
    """Return what documents rest on that neither the package nor the archive holds.

    Parameters
    ----------
    documents : mapping of str to Record
        Documents that are to be taken in, by key.
    holdings : Holdings
        Package and archive together.
    """
    found: list[Finding] = []
    for key, document in documents.items():
        lacking = [text for text, keys in holdings.required(document) if not keys]
        if lacking:
            some = ", ".join(lacking[:8]) + (f" and {len(lacking) - 8} more" if len(lacking) > 8 else "")
            found.append(
                fault(
                    "package-incomplete",
                    f"{address_of_key(key)} rests on what is neither here nor in the archive",
                    f"data/{sealed_path(key)}",
                    found=some,
                    remedy="ask for a package with all that it rests on: stillroom export includes it",
                )
            )
    return found
