"""What every request must pass, and what every answer carries.

Rules
-----
* Only GET and HEAD; nothing a browser asks for changes anything.
* The Host header must name this server, so that a page elsewhere cannot reach it under a name of its own.
* Where a token is asked for, it comes once in the address and then as a cookie, and is compared in constant time.

References
----------
.. [1] RFC 9110, HTTP Semantics: section 7.2 (Host), 15.5.6 (405), 15.5.20 (421).
.. [2] Content Security Policy Level 3, W3C.
"""

from __future__ import annotations

import hmac
import ipaddress
from collections.abc import Iterator
from urllib.parse import parse_qsl, urlencode

from starlette.datastructures import Headers, MutableHeaders
from starlette.requests import Request
from starlette.responses import PlainTextResponse, RedirectResponse, Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

__all__ = ["HEADERS", "Guard", "host_name"]

HEADERS = {
    "Content-Security-Policy": "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; "
    "connect-src 'self'; base-uri 'none'; form-action 'self'; frame-ancestors 'none'",
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cross-Origin-Resource-Policy": "same-origin",
    "Cross-Origin-Opener-Policy": "same-origin",
}
"""On every answer; one that needs another policy, such as a run sheet, brings its own."""

ANY_ADDRESS = "*"
"""In `hosts`: any number of an address is welcome too, since a number cannot be given another meaning."""


def host_name(host: str) -> str:
    """Return the name or number in a Host header, without its port.

    Examples
    --------
    >>> host_name("localhost:8321"), host_name("[::1]:8321"), host_name("fridge")
    ('localhost', '[::1]', 'fridge')
    """
    if host.startswith("["):
        return host.partition("]")[0].lower() + "]"
    return host.partition(":")[0].lower()


class Guard:
    """ASGI application around another one."""

    def __init__(self, app: ASGIApp, *, hosts: frozenset[str], token: str | None) -> None:
        self.app = app
        self._hosts = hosts
        self._token = token

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Let a request through, or refuse it with a sentence."""
        if scope["type"] != "http":
            if scope["type"] == "lifespan":
                await self.app(scope, receive, send)
            return
        guarded = _with_headers(send)
        refusal = self._refusal(scope)
        await (self.app if refusal is None else refusal)(scope, receive, guarded)

    def _refusal(self, scope: Scope) -> Response | None:
        hosts = Headers(scope=scope).getlist("host")
        if len(hosts) != 1:
            return PlainTextResponse("A request needs one Host header.\n", 400)
        if not self._known(host_name(hosts[0])):
            return PlainTextResponse(
                "This server does not go by that name. Open the address that it printed when it was started.\n",
                421,
            )
        if scope["method"] not in ("GET", "HEAD"):
            return PlainTextResponse(
                "These pages can only be read: GET or HEAD.\n", 405, headers={"Allow": "GET, HEAD"}
            )
        return None if self._token is None else self._without_token(Request(scope), self._token)

    def _known(self, name: str) -> bool:
        return name in self._hosts or (ANY_ADDRESS in self._hosts and _is_number(name))

    def _without_token(self, request: Request, token: str) -> Response | None:
        if _equal(request.cookies.get(_cookie(request), ""), token):
            return None
        given = list(_query(request))
        if any(name == "token" and _equal(value, token) for name, value in given):
            rest = urlencode([(name, value) for name, value in given if name != "token"])
            # Without a host: back to where the browser came from, with the token out of its history.
            path = "/" + request.scope["raw_path"].decode("ascii", "replace").lstrip("/")
            answer = RedirectResponse(f"{path}?{rest}" if rest else path, 303)
            answer.set_cookie(_cookie(request), token, httponly=True, samesite="strict", path="/")
            answer.headers["Cache-Control"] = "no-store"
            return answer
        return PlainTextResponse(
            "These pages ask for a token. Open the address with ?token=... that was printed when the server was started.\n",
            401,
            headers={"WWW-Authenticate": "stillroom-token", "Cache-Control": "no-store"},
        )


def _cookie(request: Request) -> str:
    """Return the name of the cookie: browsers do not keep those of two ports of one machine apart."""
    server = request.scope.get("server") or ("", 0)
    return f"stillroom-token-{server[1] or 0}"


def _query(request: Request) -> Iterator[tuple[str, str]]:
    yield from parse_qsl(request.url.query, keep_blank_values=True)


def _equal(given: str, token: str) -> bool:
    return hmac.compare_digest(given.encode("utf-8", "replace"), token.encode())


def _is_number(name: str) -> bool:
    try:
        ipaddress.ip_address(name.strip("[]"))
    except ValueError:
        return False
    return True


def _with_headers(send: Send) -> Send:
    async def guarded(message: Message) -> None:
        if message["type"] == "http.response.start":
            headers = MutableHeaders(scope=message)
            for name, value in HEADERS.items():
                headers.setdefault(name, value)
            headers.setdefault("Cache-Control", "private, no-cache")
        await send(message)

    return guarded
