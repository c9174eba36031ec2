"""Style sheets, scripts and drawings that are the same for everybody: kept in memory, named by their content.

A path holds the digest of all of them, so that a browser may keep what it has for good, and scripts may name each other
relative to themselves.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from functools import cache
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import PurePosixPath

from starlette.exceptions import HTTPException
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

__all__ = ["static_file", "static_path"]

_FOLDERS = ("style", "scripts", "vendor")
_TYPES = {
    ".css": "text/css; charset=utf-8",
    ".js": "text/javascript; charset=utf-8",
    ".svg": "image/svg+xml",
    ".md": "text/plain; charset=utf-8",
    "": "text/plain; charset=utf-8",
}


@cache
def _every() -> dict[str, bytes]:
    root = files("templates").joinpath("web")
    return {
        f"{folder}/{name}": content for folder in _FOLDERS for name, content in _below(root.joinpath(folder))
    }


def _below(folder: Traversable, before: str = "") -> Iterator[tuple[str, bytes]]:
    if not folder.is_dir():
        return
    for each in sorted(folder.iterdir(), key=lambda one: one.name):
        if each.is_dir():
            yield from _below(each, f"{before}{each.name}/")
        elif PurePosixPath(each.name).suffix in _TYPES:
            yield before + each.name, each.read_bytes()


@cache
def _version() -> str:
    digest = hashlib.sha256()
    for name, content in _every().items():
        digest.update(f"{name}\n{len(content)}\n".encode())
        digest.update(content)
    return digest.hexdigest()[:16]


def static_path(name: str) -> str:
    """Return the path of a static file, such as `style/stillroom.css`.

    Raises
    ------
    KeyError
        If there is none, so that a template cannot name one that is not there.
    """
    _every()[name]
    folder, _, rest = name.partition("/")
    return f"/{folder}/{_version()}/{rest}"


async def static_file(request: Request) -> Response:
    """Answer with a static file."""
    folder = request.url.path.split("/")[1]
    name = f"{folder}/{request.path_params['name']}"
    content = _every().get(name)
    if content is None:
        raise HTTPException(404)
    if request.path_params["version"] != _version():
        return RedirectResponse(static_path(name), 307)
    return Response(
        content,
        media_type=_TYPES[PurePosixPath(name).suffix],
        headers={"Cache-Control": "public, max-age=31536000, immutable"},
    )
