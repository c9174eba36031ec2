"""What a sealed file rests on, and which files a package has to hold so that each of them can be read and repeated.

Rules
-----
* A cooldown's own account, its accessions and what was amended or withdrawn, goes together: half of it would be another.
* What a reduction rests on goes with it: the cooldowns whose channels it took, earlier reductions, records sealed alone.
* Documents of a kind that this module does not know are searched for addresses, so that a new kind is never left behind.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from functools import cached_property
from typing import Any

from archive.errors import BadRequest, MissingFile, UnknownAddress
from schemas.address import Address, parse_address
from schemas.base import Record
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["ASKED", "Holdings", "address_of_key", "behind", "closure", "in_order", "needs_of"]

_FIRST = datetime.min.replace(tzinfo=UTC)
ASKED = "asked for"


def address_of_key(key: str) -> str:
    """Return the address of the document that a key's file carries.

    Examples
    --------
    >>> address_of_key("2026-03/2026-03.a1"), address_of_key("2026-03/s017@film-transition.2")
    ('2026-03.a1', '2026-03/s017@film-transition.2')
    """
    return key if "@" in key else key.rpartition("/")[2]


def needs_of(document: Record) -> tuple[str, ...]:
    """Return the addresses that a document rests on, each once, in the order of the document."""
    if isinstance(document, ReductionDocument):
        step_inputs = (entry.address for step in document.steps for entry in step.inputs.values())
        found = [
            document.sweep,
            *(entry.address for entry in document.inputs),
            *step_inputs,
            document.supersedes,
        ]
    elif isinstance(document, AccessionDocument):
        # A calibration made in an archive rests on the reduction that found it.
        made_from = (entry.content.get("made_from") for entry in document.records)
        found = [document.supplements, *(each for each in made_from if isinstance(each, str))]
    else:
        found = list(_texts(document.model_dump(mode="json")))
    own = str(getattr(document, "address", ""))
    return tuple(
        dict.fromkeys(
            each for each in found if each and each.partition("#")[0] != own and _parsed(each) is not None
        )
    )


def _texts(content: Any) -> Iterator[str]:
    if isinstance(content, str):
        yield content
    elif isinstance(content, dict):
        for value in content.values():
            yield from _texts(value)
    elif isinstance(content, list):
        for value in content:
            yield from _texts(value)


def _parsed(text: str) -> Address | None:
    try:
        return parse_address(text)
    except ValueError:
        return None


@dataclass(frozen=True)
class Holdings:
    """Sealed files among which things are looked up.

    Attributes
    ----------
    keys : collection of str
    document : callable
        Document of a key.
    """

    keys: Collection[str]
    document: Callable[[str], Record]

    @cached_property
    def _by_folder(self) -> dict[str, list[str]]:
        found: dict[str, list[str]] = {}
        for key in sorted(self.keys):
            found.setdefault(key.partition("/")[0], []).append(key)
        return found

    @cached_property
    def _alone(self) -> dict[str, list[str]]:
        found: dict[str, list[str]] = {}
        for key in sorted(self.keys):
            if "@" not in key:
                found.setdefault(address_of_key(key), []).append(key)
        return found

    def folder(self, cooldown: str) -> list[str]:
        """Return the keys of all files of a cooldown."""
        return list(self._by_folder.get(cooldown, ()))

    def account(self, cooldown: str) -> list[str]:
        """Return the keys of a cooldown's own account: accessions, amendments, withdrawals."""
        return [key for key in self.folder(cooldown) if "@" not in key]

    def holding(self, address: Address) -> list[str]:
        """Return the keys of the files that hold what an address names; none if no file does."""
        if address.reduction is not None:
            return [address.reduction] if address.reduction in self.keys else []
        alone = self._alone.get(address.text)
        if alone is not None:
            return list(alone)
        return (
            self.account(address.head)
            if address.kind in ("name", "accession", "raw", "item", "channel")
            else []
        )

    def covering(self, address: Address) -> list[str]:
        """Return the keys of the files that hold what an address names; none if they do not hold that very thing."""
        keys = self.holding(address)
        if not keys or address.kind in (
            "name",
            "record",
            "amendment",
            "withdrawal",
            "accession",
            "reduction",
        ):
            return keys
        return keys if any(_holds(self.document(key), address) for key in keys) else []

    def required(self, document: Record) -> Iterator[tuple[str, list[str]]]:
        """Yield each address that a document rests on and that a file of its own must hold, with the keys found."""
        for text in needs_of(document):
            address = parse_address(text)
            keys = self.covering(address)
            # A record stands in the accession too, and a text of an unknown kind may only look like an address.
            certain = isinstance(document, AccessionDocument | ReductionDocument) and address.kind not in (
                "record",
                "name",
            )
            if keys or certain:
                yield text, keys


def _holds(document: Record, address: Address) -> bool:
    """Whether a document is that of what an address names a part of."""
    if isinstance(document, ReductionDocument):
        return document.address == address.reduction and any(
            each.name == address.part for each in document.outputs
        )
    if not isinstance(document, AccessionDocument):
        return False
    if address.kind == "raw":
        return document.number == address.number and any(
            each.name == address.raw for each in document.raw_files
        )
    if address.part is None and any(each.name == address.item for each in document.doses):
        return True
    return any(
        each.name == address.item
        and (address.part is None or any(one.name == address.part for one in each.channels))
        for each in document.sweeps
    )


def closure(asked: Sequence[str], holdings: Holdings) -> dict[str, str]:
    """Return the keys of all files behind addresses, each with the reason why it is there.

    Parameters
    ----------
    asked : sequence of str
        Cooldowns, sweeps, accessions, reductions or outputs.
    holdings : Holdings
        What the archive holds.

    Returns
    -------
    dict of str to str
        In the order in which the files can be recorded.

    Raises
    ------
    BadRequest
        A text is no address, or names a record without a file of its own.
    UnknownAddress
        The archive holds no such thing.
    MissingFile
        Something that a file rests on is not there.
    """
    return behind({key: ASKED for text in asked for key in _asked_for(text, holdings)}, holdings)


def behind(start: Mapping[str, str], holdings: Holdings) -> dict[str, str]:
    """Return keys and all that they rest on, each with the reason why it is there, in an order of recording.

    Parameters
    ----------
    start : mapping of str to str
        Keys, each with its reason.
    holdings : Holdings

    Raises
    ------
    MissingFile
        Something that a file rests on is not there.
    """
    reasons: dict[str, str] = {}
    waiting = list(start.items())
    while waiting:
        key, because = waiting.pop(0)
        if key in reasons:
            continue
        reasons[key] = because
        document = holdings.document(key)
        name, head = address_of_key(key), key.partition("/")[0]
        if getattr(document, "cooldown", None) == head:
            waiting += [(each, f"belongs to cooldown {head}") for each in holdings.account(head)]
        else:
            waiting += [(each, f"is about {name}") for each in holdings.folder(head) if f"/{name}." in each]
        for text, found in holdings.required(document):
            if not found:
                raise MissingFile(
                    f"{name} rests on {text}, which is not in this archive",
                    file=key,
                    remedy="run: stillroom fixity; then restore the file from a copy",
                )
            waiting += [(each, f"{name} rests on it") for each in found]
    return {key: reasons[key] for key in in_order(reasons, holdings.document)}


def _asked_for(text: str, holdings: Holdings) -> list[str]:
    try:
        address = parse_address(text)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    found = holdings.covering(address)
    if address.kind == "name":
        found += holdings.folder(address.head)
    elif address.kind == "item" and found:
        found += [key for key in holdings.folder(address.head) if key.startswith(f"{text}@")]
    if found:
        return sorted(set(found))
    if address.kind == "record":
        raise BadRequest(
            f"{text} is part of the cooldowns that used it and has no file of its own",
            expected="a cooldown, a sweep, a reduction or one of its outputs",
            remedy="export a cooldown that used it",
        )
    raise UnknownAddress(
        f"there is nothing at {text} in this archive", remedy="list it with: stillroom search"
    )


def in_order(keys: Collection[str], document: Callable[[str], Record]) -> list[str]:
    """Return keys in an order in which they can be recorded: accessions, other acts, reductions; older before newer."""

    def place(key: str) -> tuple[int, datetime, str]:
        content = document(key)
        if isinstance(content, AccessionDocument):
            return 0, content.accessioned, key
        if isinstance(content, ReductionDocument):
            return 3, content.end, key
        moment = getattr(content, "made", None)
        # What is amended or withdrawn may be a revision that was sealed alone.
        return (1 if getattr(content, "cooldown", None) is None else 2), moment or _FIRST, key

    return sorted(keys, key=place)
