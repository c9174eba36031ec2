"""`stillroom.toml`: the few settings of one archive."""

from __future__ import annotations

import json
from pathlib import Path

from pydantic import Field

from archive.errors import BadRequest, InvalidSheet, NotAnArchive
from archive.intake.sheet import LineMap, validated
from archive.intake.thresholds import Thresholds
from archive.store.plain_text import plain_text
from schemas.base import Record, Text
from schemas.deposit import Deposit
from schemas.toml_text import TomlFault, tables_of

__all__ = ["SETTINGS_NAME", "Settings", "read_settings", "settings_text", "settings_without_index"]

SETTINGS_NAME = "stillroom.toml"
_LARGEST = 5_000_000  # bytes, as for a sheet


class Settings(Record):
    """Settings of an archive."""

    name: Text = Field(min_length=1, description="Name of the laboratory's archive.")
    index: str = Field(
        default="sqlite:///index.sqlite3",
        pattern=r"^[^\x00-\x1f\x7f]+$",
        description="Address of the index: a SQLite file beside this one, or postgresql+psycopg://...",
    )
    thresholds: Thresholds = Field(
        default_factory=Thresholds, description="The lab's own limits of the checks."
    )
    exchange: Deposit = Field(
        default_factory=lambda: Deposit(),
        description="Authors, publisher and licence of packages that leave the archive.",
    )

    def index_address(self, root: Path) -> str:
        """Address of the index, with the place of a SQLite file filled in."""
        prefix = "sqlite:///"
        if self.index.startswith(prefix):
            return prefix + str((root / self.index[len(prefix) :]).resolve())
        return self.index


def settings_text(name: str, index: str | None) -> str:
    """Text of a new `stillroom.toml`."""
    lines = [
        "# Settings of this archive. The sealed files beside it carry everything else.",
        f"name = {_quoted(name)}",
    ]
    if index is not None:
        lines.append(f"index = {_quoted(index)}")
    lines += [
        "",
        "# Limits of the checks, where this laboratory sets its own:",
        "# [thresholds]",
        "",
        "# Who made the data, for packages that leave the archive (stillroom export); what is not stated is left out:",
        "# [exchange]",
        '# publisher = ""          # the laboratory or repository that makes the data available',
        '# licence = "CC-BY-4.0"   # SPDX identifier, for cooldowns whose sheet states none',
        "# [[exchange.author]]     # one for each author, in their order",
        '# family = ""',
        '# given = ""',
        '# orcid = ""              # and affiliation, affiliation_ror',
        "",
    ]
    return "\n".join(lines)


def _quoted(text: str) -> str:
    # A JSON string is a TOML basic string, but for the one control character that JSON leaves as it is.
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def read_settings(root: Path) -> Settings:
    """Settings of the archive in a folder.

    Raises
    ------
    NotAnArchive
        If there is no `stillroom.toml`.
    InvalidSheet
        If it cannot be read; the message holds every fault with its line.
    """
    path = root / SETTINGS_NAME
    try:
        text = plain_text(path, at_most=_LARGEST)
    except FileNotFoundError:
        raise NotAnArchive(
            "there is no archive in this folder", file=str(root), remedy="make one with: stillroom init DIR"
        ) from None
    except (OSError, UnicodeDecodeError, BadRequest) as error:
        raise InvalidSheet("the settings cannot be read", file=str(path), found=str(error)) from None
    try:
        tables = tables_of(text)
    except TomlFault as fault:
        raise InvalidSheet(
            f"the settings are not valid TOML: {fault}", file=str(path), line=fault.line, column=fault.column
        ) from None
    settings, findings = validated(Settings, tables, file=str(path), lines=LineMap(text))
    if settings is None:
        raise InvalidSheet("; ".join(finding.sentence() for finding in findings))
    return settings


def settings_without_index(root: Path) -> bytes:
    """Text of the settings but for the address of the index, which says where this copy of the archive has its own."""
    kept, in_table = [], False
    for line in (root / SETTINGS_NAME).read_bytes().splitlines(keepends=True):
        in_table = in_table or line.lstrip().startswith(b"[")
        if in_table or line.partition(b"=")[0].strip() != b"index":
            kept.append(line)
    return b"".join(kept)
