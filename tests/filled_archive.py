"""A small archive to look at: a cooldown that is reduced, one whose every text tries something, and what was said afterwards."""

from __future__ import annotations

from pathlib import Path

from archive import Archive
from tests.fuzz.hostile import EVIL, hostile_folder
from tests.small_cooldown import write_folder

__all__ = ["HOSTILE", "NAME", "PLAIN", "filled"]

NAME = "Cold <b>room</b> & annexe"
PLAIN = "2025-11"
HOSTILE = "2026-03"
# So that the things of the two cooldowns are not the same ones.
_RENAMED = {"bob": "TO-1", "plastic": "PI-1", "fridge": "DR-1", "well-helium": "W-4", "2026-03-": "2025-11-"}


def filled(folder: Path) -> Path:
    """Make the archive below a folder, and return its own."""
    with Archive.create(folder / "lab", name=NAME) as lab:
        lab.ingest(_plain(folder / PLAIN))
        lab.reduce(PLAIN)
        lab.ingest(hostile_folder(folder / HOSTILE))
        lab.withdraw(f"{HOSTILE}/s001", why=EVIL, by=EVIL)
        return lab.root


def _plain(folder: Path) -> Path:
    for file in write_folder(folder, name=PLAIN).iterdir():
        text = file.read_text(encoding="utf-8")
        for old, new in _RENAMED.items():
            text = text.replace(old, new)
        file.write_text(text, encoding="utf-8")
    return folder
