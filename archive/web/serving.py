"""The server: a socket, the application, and an end without noise."""

from __future__ import annotations

import ipaddress
import secrets
import socket
import webbrowser
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path

import uvicorn

from archive.errors import BadRequest
from archive.web.app import LOOPBACK_NAMES, application
from archive.web.guard import ANY_ADDRESS

__all__ = ["is_loopback", "serve"]

_MOST_CONNECTIONS = 200
_BACKLOG = 64


def is_loopback(host: str) -> bool:
    """Return whether nothing but this machine can reach a server on an address."""
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host.strip("[]")).is_loopback
    except ValueError:
        return False


def serve(
    root: Path,
    *,
    host: str,
    port: int,
    ask_token: bool,
    started: Callable[[str, str | None], None],
    open_browser: bool = False,
) -> None:
    """Serve the archive in a folder until the process is told to stop.

    Parameters
    ----------
    root : Path
        Folder of the archive.
    host, port
        Address to listen at; port 0 is any that is free.
    ask_token : bool
        Whether a token is asked for on a loopback address as well; on any other it always is.
    started : callable
        Told the address to open, with the token in it, and the token, once the server can be reached.
    open_browser : bool
        Whether to open that address.

    Raises
    ------
    BadRequest
        If the address cannot be listened at.
    """
    listening = _socket(host, port)
    token = secrets.token_urlsafe(24) if ask_token or not is_loopback(host) else None
    names = (
        LOOPBACK_NAMES
        if is_loopback(host)
        else {host.lower(), socket.gethostname().lower(), ANY_ADDRESS, *LOOPBACK_NAMES}
    )
    app = application(root, hosts=names, token=token)
    shown = "localhost" if host in ("0.0.0.0", "::", "127.0.0.1", "::1") else host  # noqa: S104 - compared, not bound
    address = f"http://{shown}:{listening.getsockname()[1]}/" + (f"?token={token}" if token else "")
    config = uvicorn.Config(
        app, log_level="warning", access_log=False, server_header=False, proxy_headers=False, lifespan="on",
        limit_concurrency=_MOST_CONNECTIONS, timeout_keep_alive=15, timeout_graceful_shutdown=3,
    )  # fmt: skip
    started(address, token)
    if open_browser:
        webbrowser.open(address)
    with listening, suppress(KeyboardInterrupt):
        uvicorn.Server(config).run(sockets=[listening])


def _socket(host: str, port: int) -> socket.socket:
    try:
        family, kind, protocol, _, place = socket.getaddrinfo(
            host.strip("[]"), port, type=socket.SOCK_STREAM, flags=socket.AI_PASSIVE
        )[0]
        listening = socket.socket(family, kind, protocol)
    except OSError as error:
        raise BadRequest(
            "there is no such address on this machine",
            field="--host",
            found=host,
            expected=str(error.strerror),
        ) from None
    try:
        listening.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        listening.bind(place)
        listening.listen(_BACKLOG)
    except OSError as error:
        listening.close()
        raise BadRequest(
            f"the server cannot listen at {host}:{port}: {error.strerror}", field="--port", found=str(port),
            remedy="choose another port, or --port 0 for any that is free",
        ) from None  # fmt: skip
    listening.set_inheritable(False)
    return listening
