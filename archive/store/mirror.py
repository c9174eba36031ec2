"""Sealed files of an archive copied to another place, each synced and read back before it has its name there.

Only what is not there yet is copied, so that a mirror is cheap to keep up and one that was interrupted goes on. Nothing in
a mirror is overwritten: a file of other bytes there is told, not replaced.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from archive.errors import BadRequest
from archive.store import durable
from archive.store.interface import Damage, SealedFile
from archive.store.local import LocalStore
from archive.store.sealed import writing

__all__ = ["Copied", "mirrored"]

_BLOCK = 1 << 20


@dataclass(frozen=True)
class Copied:
    """What a pass over the sealed files did.

    Attributes
    ----------
    copied : tuple of str
        Keys that were copied.
    present : int
        How many were there already.
    damage : tuple of Damage
        What stands in the mirror with other bytes or another size, and what could not be read here.
    """

    copied: tuple[str, ...]
    present: int
    damage: tuple[Damage, ...]


def mirrored(
    store: LocalStore,
    recorded: Mapping[str, SealedFile],
    target: LocalStore,
    *,
    thorough: bool = False,
    progress: Callable[[int, int, str], None] | None = None,
) -> Copied:
    """Copy what is recorded and not in the mirror yet; the caller holds the mirror's lock.

    Parameters
    ----------
    store : LocalStore
        Where they are.
    recorded : mapping of str to SealedFile
        What is to be in the mirror.
    target : LocalStore
        The mirror.
    thorough : bool
        Whether files that are there already are read again too, and not only looked at for their size.
    progress : callable, optional
        Told ``(done, of, key)`` before each.

    Raises
    ------
    BadRequest
        If the mirror holds sealed files that this archive does not: then it is a mirror of another.
    """
    there = set(target.keys())
    foreign = sorted(there - set(recorded))
    if foreign:
        raise BadRequest(
            f"the target holds {len(foreign)} sealed files that this archive does not",
            file=str(target.root), found=foreign[0],
            remedy="it is no mirror of this archive, or somebody has written to it; name another folder",
        )  # fmt: skip
    copied: list[str] = []
    damage: list[Damage] = []
    for done, (key, sealed) in enumerate(sorted(recorded.items())):
        if progress is not None:
            progress(done, len(recorded), key)
        if key in there:
            damage += _differing(target, sealed, thorough=thorough)
        else:
            fault = _copy(store, sealed, target)
            if fault is None:
                copied.append(key)
            else:
                damage.append(fault)
    if progress is not None:
        progress(len(recorded), len(recorded), "")
    return Copied(tuple(copied), len(there), tuple(damage))


def _differing(target: LocalStore, sealed: SealedFile, *, thorough: bool) -> list[Damage]:
    path = target.path(sealed.key)
    if path.stat().st_size != sealed.size:
        return [
            Damage(
                sealed.key, "damaged", f"it has another size in the mirror: {path}", expected=f"{sealed.size} bytes",
                found=f"{path.stat().st_size} bytes",
            )
        ]  # fmt: skip
    if thorough and (found := durable.file_digest(path)[0]) != sealed.sha256:
        return [
            Damage(
                sealed.key,
                "damaged",
                f"it has other bytes in the mirror: {path}",
                expected=sealed.sha256,
                found=found,
            )
        ]
    return []


def _copy(store: LocalStore, sealed: SealedFile, target: LocalStore) -> Damage | None:
    origin, final = store.path(sealed.key), target.path(sealed.key)
    if origin.is_symlink() or not origin.is_file():
        return Damage(sealed.key, "missing", "it is not in this archive, so it was not copied")
    with writing(final):
        staged = durable.staging_path(target.root, sealed.key)
        try:
            with origin.open("rb") as source, staged.open("xb") as copy:
                while block := source.read(_BLOCK):
                    copy.write(block)
            durable.settle(staged)
            # One digest says both that the original is whole and that the mirror's disk took it.
            found = durable.file_digest(staged)
            if found != (sealed.sha256, sealed.size):
                return Damage(
                    sealed.key, "damaged", "its bytes are not those that were sealed, so it was not copied",
                    expected=sealed.sha256, found=found[0],
                )  # fmt: skip
            durable.take_name(staged, final, root=target.root, key=sealed.key)
        finally:
            durable.discard(staged)
    return None
