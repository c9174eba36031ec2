"""Fixity: whether the archive still holds what was recorded, byte for byte, and nothing else."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from archive.store.interface import Damage, SealedFile, Store

__all__ = ["Damage", "fixity"]


def fixity(
    store: Store,
    recorded: Mapping[str, SealedFile],
    progress: Callable[[int, int, str], None] | None = None,
) -> list[Damage]:
    """Return everything that is damaged, missing or not recorded.

    Parameters
    ----------
    store : Store
        What is there.
    recorded : mapping of str to SealedFile
        What should be there, by key, from a place other than the files themselves.
    progress : callable, optional
        Told ``(done, of, key)`` before each file, and ``(of, of, "")`` at the end.

    Returns
    -------
    list of Damage
        Recorded files by key, then what lies there unrecorded; empty if the archive is whole.

    Notes
    -----
    Every recorded file is reread completely. A file whose bytes are right is still opened as HDF5, so that a record
    made of a damaged file does not vouch for it.
    """
    damage: list[Damage] = []
    for done, key in enumerate(sorted(recorded)):
        if progress is not None:
            progress(done, len(recorded), key)
        damage += store.verify(key, recorded[key].sha256)
    if progress is not None:
        progress(len(recorded), len(recorded), "")
    unrecorded = [key for key in store.keys("") if key not in recorded]
    damage += [Damage(key, "stray", "a sealed file that is not recorded") for key in unrecorded]
    damage += [
        Damage(path, "stray", "a staging file that a writer left behind, or is still writing")
        if path.startswith("staging/")
        else Damage(path, "stray", "not a sealed file, yet it lies among them")
        for path in store.strays()
    ]
    return damage
