"""What stops an operation, as one flat family with an exit code per kind.

Rules: a fault of the data is a finding and is returned with all the others (`schemas.finding`); only what
stops an operation is raised. Both speak in the same terms: what, where, found, expected, remedy.
"""

from __future__ import annotations

import tempfile
import traceback
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import UTC, datetime

from typing_extensions import override

__all__ = [
    "AlreadySealed",
    "ArchiveBusy",
    "ArchiveError",
    "BadRequest",
    "DamagedFile",
    "InvalidSheet",
    "MissingFile",
    "NotAnArchive",
    "StepFailed",
    "Stopped",
    "UnknownAddress",
    "kept_traceback",
    "told",
]

EXIT_BAD_INPUT = 2
EXIT_DAMAGE = 3
EXIT_BUSY = 4


@dataclass
class ArchiveError(Exception):
    """Base of everything Stillroom raises on purpose.

    Parameters
    ----------
    what : str
        One sentence: what is wrong.
    file, line, column, field : optional
        Where; `line` and `column` count from one.
    expected, found, remedy : str, optional
        What should have stood there, what stood there, and what to do next.
    """

    what: str
    file: str | None = None
    line: int | None = None
    column: int | None = None
    field: str | None = None
    expected: str | None = None
    found: str | None = None
    remedy: str | None = None

    code = "archive-error"
    exit_code = EXIT_BAD_INPUT

    @override
    def __str__(self) -> str:
        """Return the sentence: where, what, found, expected, remedy."""
        place = ", ".join(
            part
            for part in (
                self.file,
                None if self.line is None else f"line {self.line}",
                None if self.column is None else f"column {self.column}",
                self.field,
            )
            if part
        )
        sentence = f"{place}: {self.what}" if place else self.what
        if self.found is not None:
            sentence += f"; found {self.found}"
        if self.expected is not None:
            sentence += f"; expected {self.expected}"
        if self.remedy is not None:
            sentence += f"; {self.remedy}"
        return sentence


class InvalidSheet(ArchiveError):
    """A sheet, record or plan cannot be read as what it claims to be."""

    code = "invalid-sheet"


class BadRequest(ArchiveError):
    """A command or call asks for something that cannot be done as asked."""

    code = "bad-request"


class UnknownAddress(ArchiveError):
    """No thing in this archive has that address."""

    code = "unknown-address"


class AlreadySealed(ArchiveError):
    """The name is taken by a sealed file; sealed files never change."""

    code = "already-sealed"


class StepFailed(ArchiveError):
    """A reduction step could not produce its outputs."""

    code = "step-failed"


class MissingFile(ArchiveError):
    """A file that must be there is not."""

    code = "missing-file"
    exit_code = EXIT_DAMAGE


class DamagedFile(ArchiveError):
    """The bytes of a file are not the bytes that were sealed."""

    code = "damaged-file"
    exit_code = EXIT_DAMAGE


class ArchiveBusy(ArchiveError):
    """Another process is writing to the archive."""

    code = "busy"
    exit_code = EXIT_BUSY


class NotAnArchive(ArchiveError):
    """The folder holds no Stillroom archive."""

    code = "not-an-archive"
    exit_code = EXIT_BUSY


class Stopped(KeyboardInterrupt):
    """The person stopped the operation; says how far it had come."""


def kept_traceback(error: BaseException) -> str:
    """Return the name of a file that holds the details of a fault that nobody expected, for whoever mends it."""
    now = datetime.now(UTC).strftime("%Y%m%dT%H%M%SZ")
    text = "".join(traceback.format_exception(error))
    try:
        with tempfile.NamedTemporaryFile(
            "w",
            prefix=f"stillroom-traceback-{now}-",
            suffix=".txt",
            delete=False,
            encoding="utf-8",
            errors="backslashreplace",
        ) as stream:
            stream.write(text)
            return stream.name
    except OSError:
        return f"no file, since none could be written: {type(error).__name__}: {error}"


@contextmanager
def told(option: str | None = None) -> Iterator[None]:
    """Turn a ValueError about what a person asked for into a refusal that names where it was asked.

    Parameters
    ----------
    option : str, optional
        Option, argument or field that holds the text.

    Raises
    ------
    BadRequest
        With the sentence of the ValueError; of several faults the first.
    """
    try:
        yield
    except ValueError as error:
        raise BadRequest(_sentence(error), field=option) from None


def _sentence(error: ValueError) -> str:
    faults = getattr(error, "errors", None)
    if faults is None:
        return str(error)
    first = faults(include_url=False)[0]
    place = ".".join(str(part) for part in first["loc"])
    text = str(first.get("ctx", {}).get("error", first["msg"]))
    return f"{place}: {text}" if place else text
