"""The page of what went wrong: what, where, and what to do next."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

from starlette.requests import Request
from starlette.responses import Response

from archive.errors import (
    ArchiveBusy,
    ArchiveError,
    BadRequest,
    DamagedFile,
    MissingFile,
    NotAnArchive,
    UnknownAddress,
)
from archive.lab import Archive
from archive.web.near import near
from archive.web.page import page

__all__ = ["fault_page"]


@dataclass(frozen=True)
class _Kind:
    """Status of an answer, its heading, and what to do next."""

    status: int
    title: str
    then: tuple[str, ...] = ()


_KINDS: Final[dict[type[ArchiveError], _Kind]] = {
    UnknownAddress: _Kind(
        404, "Nothing has this address", ("Look among the cooldowns, or search for a word of its notes.",)
    ),
    BadRequest: _Kind(
        400, "That cannot be asked so", ("Correct the field that is named above, and ask again.",)
    ),
    ArchiveBusy: _Kind(
        503,
        "The archive is busy",
        ("Somebody is writing to it. Load this page again in a moment; nothing is lost by waiting.",),
    ),
    DamagedFile: _Kind(
        500,
        "Something is damaged",
        (
            "Keep the archive as it is. In a terminal, stillroom fixity reads every sealed file again and names what is damaged.",
            "A damaged sealed file comes back from a copy: stillroom mend --from COPY. "
            "A damaged index is made anew from the sealed files: stillroom rebuild-index.",
        ),
    ),
    MissingFile: _Kind(
        500,
        "Something is missing",
        (
            "If it is the index: stillroom rebuild-index makes it anew from the sealed files.",
            "If it is a sealed file: stillroom mend --from COPY brings it back from a copy.",
        ),
    ),
    NotAnArchive: _Kind(
        503,
        "The archive is not there any more",
        ("See whether its disk is connected and its folder has kept its name; then load this page again.",),
    ),
}
_REFUSED = _Kind(500, "The archive refused", ("In a terminal, stillroom fixity tells whether all is whole.",))
_OURS = _Kind(
    500,
    "This is a fault of Stillroom, not yours",
    ("The details are in a file that the terminal of the server names. Nothing in the archive was changed.",),
)


def fault_page(request: Request, fault: Exception) -> Response:
    """Return the page of what stopped a page.

    Parameters
    ----------
    request : Request
    fault : Exception
        An ArchiveError says it in its own words; of anything else nothing is told but that it is ours.
    """
    kind = next(_kinds(fault), _REFUSED if isinstance(fault, ArchiveError) else _OURS)
    lab: Archive | None = getattr(request.state, "lab", None)
    return page(
        request,
        "fault.html.j2",
        status=kind.status,
        headers={"Cache-Control": "no-store", **({"Retry-After": "5"} if kind.status == 503 else {})},
        kind=kind,
        what=str(fault) if isinstance(fault, ArchiveError) else "",
        near=near(lab, request.path_params.get("address", ""))
        if kind.status == 404 and lab is not None
        else [],
    )


def _kinds(fault: Exception) -> Iterator[_Kind]:
    for each in type(fault).__mro__:
        if each in _KINDS:
            yield _KINDS[each]
