"""class Archive: open, check, ingest, reduce, find, show, trace, report.

Everything that commands, pages, notebooks and tests do to an archive goes through here. Its methods stand by what they are
for: `opened`, `working`, `looking`, `handing`.
"""

from __future__ import annotations

from archive.lab.handing import Handing
from archive.lab.looking import Looking
from archive.lab.working import Working

__all__ = ["Archive"]


class Archive(Working, Looking, Handing):
    """One laboratory's archive.

    Use `Archive.create` or `Archive.open`; as a context manager it closes its index.

    Attributes
    ----------
    root : Path
        Folder of the archive.
    settings : Settings
        What `stillroom.toml` says.
    notices : list of str
        What opening found and put in order, as sentences.

    Examples
    --------
    >>> import tempfile
    >>> from pathlib import Path
    >>> with tempfile.TemporaryDirectory() as folder, Archive.create(Path(folder) / "lab", name="Cold room") as lab:
    ...     lab.name, lab.cooldowns()
    ('Cold room', [])
    """
