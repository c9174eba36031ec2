"""What a package is about, for those who catalogue and cite it: taken from sheets and settings, never invented."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime

from archive.exchange.sealed_document import SealedDocument
from schemas.deposit import Author, Deposit
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["About", "about"]


@dataclass(frozen=True)
class About:
    """Title, description, dates, people and rights of a package.

    Attributes
    ----------
    title, description : str
    issued : date
        Day of the newest document in it.
    collected : tuple of (date, date) or None
        First and last day of the cooldowns, where the sheets say.
    authors : tuple of Author
    publisher, publisher_ror : str or None
    licences : tuple of str
        SPDX identifiers, each once.
    keywords : tuple of str
    supplement_to : tuple of str
        DOIs.
    funder, award : str or None
    missing : tuple of str
        What is not stated, each with the place where it can be.
    size : int
        Bytes of the sealed files.
    """

    title: str
    description: str
    issued: date
    collected: tuple[date, date] | None
    authors: tuple[Author, ...]
    publisher: str | None
    publisher_ror: str | None
    licences: tuple[str, ...]
    keywords: tuple[str, ...]
    supplement_to: tuple[str, ...]
    funder: str | None
    award: str | None
    missing: tuple[str, ...]
    size: int

    @property
    def citable(self) -> bool:
        """Whether enough is stated for a citation: authors and a publisher."""
        return bool(self.authors) and self.publisher is not None


def about(asked: Sequence[str], sealed: Sequence[SealedDocument], deposit: Deposit) -> About:
    """Return what a package is about.

    Parameters
    ----------
    asked : sequence of str
        Addresses that were asked for; none for a whole archive.
    sealed : sequence of SealedDocument
    deposit : Deposit
        What the archive's settings state.
    """
    accessions = [each.document for each in sealed if isinstance(each.document, AccessionDocument)]
    newest = {each.cooldown: each for each in sorted(accessions, key=lambda each: each.number)}
    reductions = [each.document for each in sealed if isinstance(each.document, ReductionDocument)]
    # What was asked for gives the name; what came along because something rests on it is told in the list of files.
    named = {name: each for name, each in newest.items() if not asked or name in asked} or newest
    kinds = sorted({document.plan.title for document in reductions if document.cooldown in named})
    purposes = " ".join(f"{name}: {_sentence(named[name].sheet.purpose)}" for name in sorted(named))
    licences = {each.sheet.licence or deposit.licence for each in newest.values()}
    return About(
        title=_title(asked, sorted(named), sorted(newest)),
        description=f"{purposes} Low-temperature measurements with every raw byte, {len(reductions)} reductions"
        + (f" ({'; '.join(kinds)})" if kinds else "")
        + ", their uncertainties and their lineage.",
        issued=max(map(_day, sealed)),
        collected=_collected(list(named.values())),
        authors=deposit.author,
        publisher=deposit.publisher,
        publisher_ror=deposit.publisher_ror,
        licences=tuple(sorted(each for each in licences if each is not None)),
        keywords=deposit.keywords,
        supplement_to=deposit.supplement_to,
        funder=deposit.funder,
        award=deposit.award,
        missing=_missing(newest, deposit),
        size=sum(each.size for each in sealed),
    )


def _title(asked: Sequence[str], named: Sequence[str], held: Sequence[str]) -> str:
    parts = [address for address in asked if address not in held]
    if parts:
        return f"Data behind {', '.join(parts[:3])}{' and others' if len(parts) > 3 else ''}"
    return f"Cooldown{'s' if len(named) > 1 else ''} {', '.join(named)}"


def _sentence(text: str) -> str:
    plain = " ".join(text.split())
    return plain if plain.endswith((".", "!", "?")) else f"{plain}."


def _day(sealed: SealedDocument) -> date:
    content = sealed.document
    moments = [getattr(content, name, None) for name in ("accessioned", "made", "end")]
    return max((moment.date() for moment in moments if isinstance(moment, datetime)), default=date.min)


def _collected(accessions: Sequence[AccessionDocument]) -> tuple[date, date] | None:
    begins = [each.sheet.begin.date() for each in accessions if each.sheet.begin is not None]
    ends = [each.sheet.end.date() for each in accessions if each.sheet.end is not None]
    return (min(begins), max(ends)) if begins and ends else None


def _missing(newest: dict[str, AccessionDocument], deposit: Deposit) -> tuple[str, ...]:
    found = []
    if not deposit.author:
        found.append("authors: [[exchange.author]] with family and given, in stillroom.toml")
    if deposit.publisher is None:
        found.append("publisher: publisher under [exchange], in stillroom.toml")
    unlicensed = sorted(
        name for name, each in newest.items() if each.sheet.licence is None and deposit.licence is None
    )
    if unlicensed:
        found.append(
            f"licence of {', '.join(unlicensed)}: licence in the sheet, or under [exchange] in stillroom.toml"
        )
    return tuple(found)
