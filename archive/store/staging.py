"""What an interrupted writer left in ``staging``: swept when it had not come to its decision, finished when it had.

One file is decided by the link to its name (`archive.store.durable`). Several files that belong together, as an import
brings them, cannot get their names in one step; so their plan is written first, whole and synced::

    stage every file, settle it -> write the plan, staging/<token>.batch -> name each file -> remove the plan

Before the plan is there, nothing has happened; from then on the whole has, and whoever opens the archive next, or goes
on writing, gives the remaining files their names.
"""

from __future__ import annotations

import json
import re
import secrets
from collections.abc import Sequence
from pathlib import Path

from archive.errors import AlreadySealed, BadRequest, DamagedFile, MissingFile
from archive.store import durable
from archive.store.names import is_key
from archive.store.plain_text import plain_text

__all__ = ["decide", "name_all", "new_plan", "sweep_staging"]

_LARGEST_PLAN = 500_000_000  # bytes; some hundred for each file of an import
_BATCH_SUFFIX = ".batch"
_FORMAT = "stillroom-batch/1"
_UNFINISHED_PLAN = re.compile(r"\.[0-9a-f]{16}\.batch\.[0-9a-f]{8}\.partial")


def new_plan(root: Path) -> Path:
    """Return a path for a plan by which staging files are to be sealed together."""
    return root / "staging" / f"{secrets.token_hex(8)}{_BATCH_SUFFIX}"


def decide(plan: Path, files: Sequence[tuple[Path, str]]) -> None:
    """Write the plan by which settled staging files are to be sealed together; once it is there, they will be.

    Parameters
    ----------
    plan : Path
        From `new_plan`.
    files : sequence of (path, key)
        Staging files and the keys that they are to have, in the order of naming.
    """
    # The plan must not outlast a name that it tells of: a power cut may keep one name of a folder and lose an older one.
    durable.sync_folder(plan.parent)
    content = {"format": _FORMAT, "files": [[staged.name, key] for staged, key in files]}
    durable.write_whole(plan, json.dumps(content, indent=1).encode())


def name_all(root: Path, plan: Path) -> list[str]:
    """Give every file of a plan its name, as far as it has none yet, remove the plan, and return the keys.

    Raises
    ------
    AlreadySealed
        If a name is taken by a file that is not of this plan; the plan stays.
    MissingFile
        If a file of the plan is neither in staging nor sealed; the plan stays.
    DamagedFile
        If the plan cannot be read.
    """
    files = _planned(plan)
    for name, key in files:  # all of them, before the first is given its name
        staged, final = root / "staging" / name, root / "sealed" / f"{key}.h5"
        if not staged.exists() and not final.exists():
            raise MissingFile(f"{key} was to be sealed and its staging file is gone", file=str(staged))
    for name, key in files:
        _give_name(root, root / "staging" / name, key)
    durable.discard(plan)
    return [key for _, key in files]


def _planned(plan: Path) -> list[tuple[str, str]]:
    try:
        content = json.loads(plain_text(plan, at_most=_LARGEST_PLAN))
        files = [(str(name), str(key)) for name, key in content["files"]]
        sound = content["format"] == _FORMAT and all(
            is_key(key) and name.endswith(durable.STAGING_SUFFIX) and Path(name).name == name
            for name, key in files
        )
    except (OSError, ValueError, KeyError, TypeError, RecursionError, BadRequest) as error:
        raise DamagedFile("the plan of an import cannot be read", file=str(plan), found=str(error)) from error
    if not sound:
        raise DamagedFile("this is no plan of an import", file=str(plan))
    return files


def _give_name(root: Path, staged: Path, key: str) -> None:
    final = root / "sealed" / f"{key}.h5"
    if not staged.exists():
        return
    if final.exists() and final.samefile(staged):
        durable.sync_folder(final.parent)
        durable.discard(staged)
        return
    if final.is_file() and final.stat().st_size == 0 < staged.stat().st_size:
        durable.discard(final)  # taken on a file system without links, but the rename did not follow
    durable.take_name(staged, final, root=root, key=key)


def sweep_staging(root: Path) -> list[str]:
    """Remove or finish what a writer left behind that did not finish, and return a sentence about each thing.

    Parameters
    ----------
    root : Path
        The archive's folder; its lock must be held by this process, since a living writer's file looks the same.

    Returns
    -------
    list of str
        What was found and done, sorted by name; empty after a clean end.

    Raises
    ------
    BadRequest
        If the lock is not held.
    """
    if not durable.holds_lock(root):
        raise BadRequest(
            "staging may be swept only by the one writer of the archive",
            file=str(root),
            expected="the archive's lock held by this process",
        )
    folder = root / "staging"
    if not folder.is_dir():
        return []
    plans = sorted(path for path in folder.iterdir() if path.name.endswith(_BATCH_SUFFIX) and path.is_file())
    sentences = [_finished(root, plan) for plan in plans]
    # What belongs to a plan that could not be finished is not swept: it is all there is of it. Where a plan cannot even be
    # read, anything may belong to it.
    kept = {plan for plan in plans if plan.exists()}
    for plan in list(kept):
        names = _names(plan)
        kept |= set(folder.iterdir()) if names is None else {folder / name for name in names}
    return sentences + [_swept(root, path) for path in sorted(folder.iterdir()) if path not in kept]


def _finished(root: Path, plan: Path) -> str:
    try:
        keys = name_all(root, plan)
    except (AlreadySealed, MissingFile, DamagedFile) as problem:
        return f"staging/{plan.name}: an import could not be finished: {problem}"
    return f"staging/{plan.name}: an import had been decided and was finished: {', '.join(keys)}"


def _names(plan: Path) -> list[str] | None:
    try:
        return [name for name, _ in _planned(plan)]
    except DamagedFile:
        return None


def _swept(root: Path, staged: Path) -> str:
    name = f"staging/{staged.name}"
    if _UNFINISHED_PLAN.fullmatch(staged.name):
        durable.discard(staged)
        return f"{name}: an import had not been decided; nothing of it was sealed"
    key = staged.name.removesuffix(durable.STAGING_SUFFIX).rpartition(".")[0].replace("~", "/", 1)
    if not staged.name.endswith(durable.STAGING_SUFFIX) or not is_key(key) or not staged.is_file():
        return f"{name} was not put there by the archive; it was left alone"
    final = root / "sealed" / f"{key}.h5"
    size = staged.stat().st_size
    if final.exists() and final.samefile(staged):
        durable.sync_folder(final.parent)
        durable.discard(staged)
        return f"{name}: {key} had been sealed whole; only its staging name was left and is removed"
    if final.is_file() and final.stat().st_size == 0 and size > 0:
        # The name was taken on a file system without links, but the rename did not follow.
        durable.discard(final)
        durable.sync_folder(final.parent)
    durable.discard(staged)
    return (
        f"{name}: the writing of {key} had not finished; its {size} bytes were removed and nothing was sealed"
    )
