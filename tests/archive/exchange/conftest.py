"""Two cooldowns of which the later rests on the earlier, and a package of the later; both are for reading."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from archive import Archive
from tests.small_cooldown import write_folder

PLAN = """\
name = "drop"
revision = 1
title = "Period drop of a film"

[applies]
sweep_kinds = ["temperature-sweep"]
empty_cell = false

[needs.empty]
plan = "empty-cell"
relation = "same-cell-any-cooldown"

[[step]]
use = "period-drop"
give = { period_drop = "period_drop", shift = "shift" }

[step.take]
temperature = "channel:@thermometer"
period = "channel:@period"
background = "need:empty#period_background"
low = "need:empty#period_low"
high = "need:empty#period_high"
"""


def without_sweep(folder: Path, name: str, file: str) -> None:
    """Take a sweep out of a cooldown folder."""
    sheet = folder / "cooldown.toml"
    parts = sheet.read_text(encoding="utf-8").split("[[sweep]]\n")
    kept = [part for part in parts if f'name = "{name}"' not in part]
    assert len(kept) == len(parts) - 1
    sheet.write_text("[[sweep]]\n".join(kept), encoding="utf-8")
    (folder / file).unlink()


def filled(folder: Path) -> Path:
    """Make an archive of two cooldowns: 2026-03 with the empty cell, and 2026-04 with a film that rests on it."""
    root = folder / "lab"
    (folder / "drop.toml").write_text(PLAN, encoding="utf-8")
    later = write_folder(folder / "2026-04", name="2026-04")
    without_sweep(later, "s001", "empty.csv")
    with Archive.create(root, name="Test laboratory") as lab:
        assert lab.ingest(write_folder(folder / "2026-03")).state == "ingested"
        assert lab.reduce("2026-03", plan="empty-cell")[0].problem is None
        assert lab.ingest(later).state == "ingested"
        assert lab.reduce("2026-04", plan=folder / "drop.toml")[0].problem is None
    return root


@pytest.fixture(scope="session")
def origin(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of the archive of two cooldowns."""
    return filled(tmp_path_factory.mktemp("exchange"))


@pytest.fixture
def lab(origin: Path) -> Iterator[Archive]:
    """Give the archive of two cooldowns, open; nothing may be written to it."""
    with Archive.open(origin) as lab:
        yield lab


@pytest.fixture(scope="session")
def package(origin: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a package of cooldown 2026-04; nothing may be written to it."""
    target = tmp_path_factory.mktemp("packages") / "2026-04"
    with Archive.open(origin) as lab:
        lab.export(["2026-04"], target, reports=False)
    return target


@pytest.fixture
def copy(package: Path, tmp_path: Path) -> Path:
    """Give a copy of the package that a test may spoil."""
    return Path(shutil.copytree(package, tmp_path / "package"))


@pytest.fixture(scope="session")
def empty(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of an empty archive; copying it is quicker than making the tables of another one."""
    root = tmp_path_factory.mktemp("empty") / "lab"
    Archive.create(root, name="Other laboratory").close()
    return root


@pytest.fixture
def other(empty: Path, tmp_path: Path) -> Iterator[Callable[..., Archive]]:
    """Make empty archives."""
    made: list[Archive] = []

    def make(name: str = "other") -> Archive:
        made.append(Archive.open(shutil.copytree(empty, tmp_path / name)))
        return made[-1]

    yield make
    for each in made:
        each.close()
