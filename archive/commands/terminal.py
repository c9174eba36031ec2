"""What a person sees: sentences, tables and progress on a terminal or in a pipe.

Rules: text that came from files cannot steer the terminal; colour never carries meaning alone and yields to `NO_COLOR`;
progress goes to stderr, only on a terminal, and only when work lasts.
"""

from __future__ import annotations

import io
import os
import shutil
import sys
import threading
import unicodedata
from collections.abc import Iterable, Sequence
from types import TracebackType
from typing import TYPE_CHECKING, Self

import click

if TYPE_CHECKING:
    from rich.console import RenderableType
    from rich.progress import Progress as Bar

__all__ = ["Progress", "clean", "draw", "note", "say", "styled", "table", "wide_output"]

# Controls (Cc), direction marks and other invisible formatting (Cf), lone surrogates (Cs).
_UNSEEN = frozenset({"Cc", "Cf", "Cs"})
# A pipe has no width; wide enough that no cell of a table is folded there.
_PIPE_WIDTH = 4000
# Below this many columns a table leaves out what can be left out, and stacks what stands side by side.
_WIDE = 120

Cell = str | tuple[str, ...]


def clean(text: str) -> str:
    r"""Text without anything that could steer a terminal; tabs and line ends become blanks.

    Examples
    --------
    >>> clean("film\x1b[31m on\tTO-4")
    'film[31m on TO-4'
    """
    return "".join(
        " " if sign in "\t\n\r\v\f" else sign
        for sign in text
        if sign in "\t\n\r\v\f" or unicodedata.category(sign) not in _UNSEEN
    )


def styled(text: str, colour: str, *, bold: bool = False) -> str:
    """Text in a colour, unless the person asked for none."""
    return text if os.environ.get("NO_COLOR") else click.style(text, fg=colour, bold=bold)


def say(text: str = "") -> None:
    """Write lines of an answer to stdout; each line is cleaned."""
    for line in text.split("\n"):
        click.echo(clean(line))


def note(text: str) -> None:
    """Write a remark beside the answer to stderr."""
    click.echo(clean(text), err=True)


def table(columns: Sequence[str], rows: Iterable[Sequence[Cell]], *, right: Iterable[str] = ()) -> None:
    """Write a table to stdout; on a terminal it fits the width, in a pipe no cell is folded.

    Parameters
    ----------
    columns : sequence of str
        Headings.
    rows : iterable of sequence of str or tuple of str
        Cells; cleaned here. Several texts of one cell stand below each other on a narrow terminal.
    right : iterable of str
        Headings of columns that are set flush right.
    """
    from rich import box
    from rich.table import Table
    from rich.text import Text

    flush = set(right)
    shown = Table(box=box.SIMPLE_HEAD, pad_edge=False, padding=(0, 1), show_edge=False)
    for place, name in enumerate(columns):
        # What stands first is an address or a name, which is copied, and so is never folded.
        shown.add_column(
            Text(name), justify="right" if name in flush else "left", overflow="fold", no_wrap=place == 0
        )
    for row in rows:
        shown.add_row(*(Text(_in_one_cell(cell)) for cell in row))
    draw(shown)


def wide_output() -> bool:
    """Whether a line may be long: in a pipe, or on a wide terminal."""
    return not sys.stdout.isatty() or shutil.get_terminal_size().columns >= _WIDE


def _in_one_cell(cell: Cell) -> str:
    if isinstance(cell, str):
        return clean(cell)
    return ("  " if wide_output() else "\n").join(clean(text) for text in cell)


def draw(shown: RenderableType) -> None:
    """Write a table or tree to stdout; in a pipe nothing is folded, and no line ends in blanks."""
    from rich.console import Console

    if sys.stdout.isatty():
        Console(file=sys.stdout, highlight=False, markup=False, emoji=False).print(shown)
        return
    stream = io.StringIO()
    Console(file=stream, highlight=False, markup=False, emoji=False, width=_PIPE_WIDTH).print(shown)
    for line in stream.getvalue().splitlines():
        click.echo(line.rstrip())


class Progress:
    """Progress of one operation, as a context manager; silent unless stderr is a terminal and work lasts.

    Parameters
    ----------
    doing : str
        What is being done, until more is known.
    """

    # Shorter work is over before anybody could read what it did.
    DELAY_S = 0.7

    def __init__(self, doing: str) -> None:
        self._doing = doing
        self._done: tuple[int, int] | None = None
        self._bar: Bar | None = None
        self._lock = threading.Lock()
        self._timer: threading.Timer | None = None

    def sentence(self, text: str) -> None:
        """Tell what is being done now."""
        with self._lock:
            self._doing = clean(text)
            self._show()

    def count(self, done: int, of: int, what: str) -> None:
        """Tell how much is done, of how much, and what comes now."""
        with self._lock:
            self._doing, self._done = clean(what) or self._doing, (done, of)
            self._show()

    def __enter__(self) -> Self:
        """Begin to wait for the moment from which progress is shown."""
        if sys.stderr.isatty() and os.environ.get("TERM") != "dumb":
            self._timer = threading.Timer(self.DELAY_S, self._start)
            self._timer.daemon = True
            self._timer.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Take the progress off the terminal."""
        with self._lock:
            if self._timer is not None:
                self._timer.cancel()
                self._timer = None
            if self._bar is not None:
                self._bar.stop()
                self._bar = None

    def _start(self) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, SpinnerColumn, TextColumn, TimeElapsedColumn
        from rich.progress import Progress as Bar

        with self._lock:
            if self._timer is None:
                return
            columns = [
                SpinnerColumn(),
                TextColumn("{task.description}", markup=False),
                BarColumn(bar_width=24),
            ]
            if self._done is not None:
                columns.append(MofNCompleteColumn())
            self._bar = Bar(*columns, TimeElapsedColumn(), console=Console(stderr=True), transient=True)
            self._bar.add_task(self._doing, total=None)
            self._bar.start()
            self._show()

    def _show(self) -> None:
        if self._bar is not None:
            done, of = self._done or (0, None)
            self._bar.update(self._bar.task_ids[0], description=self._doing, completed=done, total=of)
