"""`stillroom serve`: the archive in a browser."""

from __future__ import annotations

from pathlib import Path

import click

from archive.commands import opening
from archive.commands.opening import archive_option
from archive.commands.terminal import note, say

__all__ = ["serve"]

_PORT = 8321


@click.command(short_help="Look at the archive in a browser.")
@click.option("--host", default="127.0.0.1", show_default=True, metavar="ADDRESS",
              help="Address to listen at; any other than this machine's own asks for a token.")  # fmt: skip
@click.option(
    "--port", type=click.IntRange(0, 65535), default=_PORT, show_default=True, help="0: any that is free."
)
@click.option(
    "--token",
    "ask_token",
    is_flag=True,
    help="Ask for a token here too: for a machine that others log in to.",
)
@click.option("--open", "open_browser", is_flag=True, help="Open the first page.")
@archive_option
def serve(*, host: str, port: int, ask_token: bool, open_browser: bool, archive_dir: Path | None) -> None:
    """Show the archive as pages in a browser until Ctrl-C. Nothing can be changed there.

    It is reached from this machine only. With another address whoever has the printed token can read everything in the
    archive, and the connection is not encrypted: use it inside a network you trust, or go through ssh instead
    (`ssh -L 8321:localhost:8321 HOST`).

    \b
    Examples:
      stillroom serve --open
      stillroom serve --port 0
    """
    # Opened once for writing where that is allowed: what an interruption left is put in order before anybody looks.
    with opening.open_archive(archive_dir) as lab:
        root, name = lab.root, lab.name
    from archive import web

    def started(address: str, token: str | None) -> None:
        say(f"{name} can be read at {address}")
        if token is not None:
            note(
                "caution: whoever knows the token in this address can read the whole archive while this runs; "
                "the connection is not encrypted"
            )
        note("Ctrl-C stops it.")

    web.serve(root, host=host, port=port, ask_token=ask_token, started=started, open_browser=open_browser)
    note("stopped")
