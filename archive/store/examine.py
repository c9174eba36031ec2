"""Rereading a sealed file completely, and naming what is not as it was.

Used twice: before a file gets its name, against the digests its writer kept, and in fixity checks. A file whose bytes
have changed may make HDF5 itself stumble, so it is read in a child process; if that ends badly, the file is damaged
and nothing else is lost.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
import subprocess
import sys
from collections.abc import Iterator, Sequence
from concurrent.futures import Executor, ThreadPoolExecutor
from pathlib import Path

import h5py

if sys.platform != "win32":
    import resource

from archive.store.audit import READ_ERRORS, datasets, mark_faults, structure_faults, text_of
from archive.store.cores import usable_cores
from archive.store.durable import file_digest
from archive.store.interface import Damage, SealedFile
from archive.store.unpacking import parts_of

__all__ = ["changed_datasets", "examined", "examined_apart", "main"]

# Reading is far faster than 1 MB/s on anything an archive lies on; the minute is for starting Python on a busy machine.
_BYTES_A_SECOND, _START_S = 1_000_000, 60
# A chunk and its copies need some megabytes; the rest is what the libraries claim without using it.
_CHILD_MEMORY = 4 << 30
_FILES_A_CHILD = 200


def examined(path: Path, key: str, sha256: str | None = None) -> list[Damage]:
    """Return all damage of the file at `path`, whole-file damage first.

    Parameters
    ----------
    path : Path
        The file.
    key : str
        What it should be; compared with what it says it is.
    sha256 : str, optional
        The digest recorded elsewhere. Without it, a change outside the datasets (the text of an attribute, unused
        space) can go unseen.

    Returns
    -------
    list of Damage
        Empty if nothing is wrong.
    """
    try:
        found, size = file_digest(path)
    except OSError as error:
        return [Damage(key, "damaged", "the file cannot be read", found=str(error))]
    if sha256 is not None and found == sha256:
        # The bytes are those that were sealed after being read back: HDF5 can be trusted with them.
        return _inside(path, key)
    inside = _inside_apart(path, key, size)
    if sha256 is None:
        return inside
    named = [damage for damage in inside if damage.dataset is not None]
    what = "the bytes are not those that were sealed"
    if not inside:
        what += "; every dataset is whole, the change lies in attributes or between the datasets"
    elif named:
        what += f"; damaged: {', '.join(dict.fromkeys(damage.dataset or '' for damage in named))}"
    return [Damage(key, "damaged", what, expected=sha256, found=found), *inside]


def examined_apart(files: Sequence[tuple[Path, SealedFile]]) -> list[Damage]:
    """Return all damage inside files whose digests vouch for nothing, read in a child process.

    Parameters
    ----------
    files : sequence of (path, SealedFile)
        Where each lies, and what it should be; the digest is not compared here.
    """
    found: list[Damage] = []
    # One child for many files, since starting it costs more than reading most of them; a child that dies names none, so
    # then each file gets a child of its own.
    for start in range(0, len(files), _FILES_A_CHILD):
        some = [(path, sealed.key, sealed.size) for path, sealed in files[start : start + _FILES_A_CHILD]]
        together = _told_by_child(some)
        if isinstance(together, str) and len(some) > 1:
            for path, key, size in some:
                found += _inside_apart(path, key, size)
        else:
            found += [Damage(some[0][1], "damaged", together)] if isinstance(together, str) else together
    return found


def _inside_apart(path: Path, key: str, size: int) -> list[Damage]:
    """Return what `_inside` finds, from a child process."""
    told = _told_by_child([(path, key, size)])
    return [Damage(key, "damaged", told)] if isinstance(told, str) else told


def _told_by_child(files: Sequence[tuple[Path, str, int]]) -> list[Damage] | str:
    """Return the damage that a child process finds, or in a sentence how it ended without an answer."""
    program = "from archive.store.examine import main; main()"
    command = [sys.executable, "-c", program, *(part for path, key, _ in files for part in (str(path), key))]
    limit = _START_S + sum(size for _, _, size in files) / _BYTES_A_SECOND
    try:
        run = subprocess.run(command, capture_output=True, timeout=limit, check=False)  # noqa: S603 - our own module
    except subprocess.TimeoutExpired:
        return f"HDF5 did not come to an end with the file in {limit:.0f} s"
    try:
        return [Damage(**record) for record in json.loads(run.stdout)]
    except ValueError:
        last = run.stderr.decode("utf-8", "replace").strip().splitlines()[-1:]
        ending = f"exit code {run.returncode}{': ' if last else ''}{''.join(last)}"
        return f"HDF5 cannot cope with the file ({ending})"


def main() -> None:
    """Print the damage of files as JSON; the child process of `examined`."""
    if sys.platform != "win32":  # a damaged length must not take the machine's memory
        resource.setrlimit(resource.RLIMIT_AS, (_CHILD_MEMORY, _CHILD_MEMORY))
        resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    paths, keys = sys.argv[1::2], sys.argv[2::2]
    damage = [
        dataclasses.asdict(found)
        for path, key in zip(paths, keys, strict=True)
        for found in _inside(Path(path), key)
    ]
    sys.stdout.write(json.dumps(damage))


def _workers(jobs: int | None) -> ThreadPoolExecutor:
    return ThreadPoolExecutor(jobs or usable_cores(), "stillroom-unpacking")


def _inside(path: Path, key: str, jobs: int | None = None) -> list[Damage]:
    """Return what the file itself shows: marks, structure, checksums, digests, its own name."""
    damage = [Damage(key, "damaged", sentence) for sentence in mark_faults(path)]
    if damage:
        return damage
    try:
        with _workers(jobs) as workers, h5py.File(path, "r", locking="best-effort") as file:
            structure = structure_faults(file)
            damage += [Damage(key, "damaged", sentence, dataset=where) for where, sentence in structure]
            suspect = {where for where, _ in structure}
            for where, dataset in datasets(file):
                if where not in suspect:
                    damage += _dataset_damage(key, where, dataset, workers)
            damage += _identity_damage(key, file)
    except READ_ERRORS as error:
        damage.append(Damage(key, "damaged", "HDF5 cannot open the file", found=str(error)))
    return damage


def _identity_damage(key: str, file: h5py.File) -> Iterator[Damage]:
    says = text_of(file.attrs.get("key", ""))
    if says != key:
        yield Damage(key, "damaged", "the file says that it is another", expected=key, found=says)
    if not file.id.links.exists(b"document"):
        yield Damage(key, "damaged", "the document is not in the file", dataset="document")


def _dataset_damage(key: str, where: str, dataset: h5py.Dataset, workers: Executor) -> Iterator[Damage]:
    try:
        recorded = text_of(dataset.attrs.get("sha256", "none"))
        found = _digest(dataset, workers)
        size = dataset.attrs.get("size", dataset.size) if where.startswith("raw/") else dataset.size
    except READ_ERRORS as error:
        yield Damage(key, "damaged", "the dataset cannot be read", dataset=where, found=str(error))
        return
    if recorded != found:
        yield Damage(
            key,
            "damaged",
            "the values are not those that were sealed",
            dataset=where,
            expected=recorded,
            found=found,
        )
    if size != dataset.size:
        yield Damage(
            key,
            "damaged",
            "the raw file has another size",
            dataset=where,
            expected=str(size),
            found=str(dataset.size),
        )


def _digest(dataset: h5py.Dataset, workers: Executor) -> str:
    """Return the SHA-256 of a dataset's stored values."""
    digest = hashlib.sha256()
    for part in parts_of(dataset, workers):
        digest.update(part.tobytes())
    return digest.hexdigest()


def changed_datasets(path: Path, digests: dict[str, str], *, jobs: int | None = None) -> list[str]:
    """Return the paths of datasets that do not read back as they were written.

    Parameters
    ----------
    path : Path
        A finished file.
    digests : dict
        What its writer kept: SHA-256 of the values by path of the dataset.
    jobs : int, optional
        Threads that unpack; as many as this process may use processors if left out.
    """
    try:
        with _workers(jobs) as workers, h5py.File(path, "r", locking="best-effort") as file:
            found = {where: _digest(dataset, workers) for where, dataset in datasets(file)}
    except READ_ERRORS as error:
        if getattr(error, "errno", None) or "errno = " in str(error):
            raise  # the system's own words tell more
        found = {}  # HDF5 stumbled over other bytes than it wrote
    return sorted(where for where in digests.keys() | found.keys() if digests.get(where) != found.get(where))
