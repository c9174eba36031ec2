"""Sealed HDF5 files: write once, read, digest, verify. Knows no physics."""

from archive.store.durable import archive_lock
from archive.store.fixity import fixity
from archive.store.interface import Column, Damage, SealedFile, Store, TableWriter, Writer
from archive.store.local import LocalStore, open_store
from archive.store.memory import MemoryStore
from archive.store.staging import sweep_staging

__all__ = [
    "Column",
    "Damage",
    "LocalStore",
    "MemoryStore",
    "SealedFile",
    "Store",
    "TableWriter",
    "Writer",
    "archive_lock",
    "fixity",
    "open_store",
    "sweep_staging",
]
