"""Who may ask, and how much, before anything of a request is read.

The service listens on this machine, where any web page that is open in the browser could reach it. A request is
answered only if it names this service as its host (against names that are made to point here) and, where the
browser says which page it comes from, comes from this service.
"""

from __future__ import annotations

import asyncio
import json
from urllib.parse import urlsplit

from starlette.types import ASGIApp, Message, Receive, Scope, Send

from qsar.service.settings import Refused, Settings

_SECURITY = (
    (b"x-content-type-options", b"nosniff"),
    (b"referrer-policy", b"no-referrer"),
    (b"cross-origin-resource-policy", b"same-origin"),
    (b"cross-origin-opener-policy", b"same-origin"),
    (b"x-frame-options", b"DENY"),
)
_POLICY = (
    b"default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; connect-src 'self'; "
    b"form-action 'self'; base-uri 'none'; frame-ancestors 'none'"
)
_TOO_LARGE = 413


class Guard:
    """ASGI middleware that checks host, origin and size, and adds the headers that browsers obey.

    Parameters
    ----------
    app : ASGI application
    settings : Settings
    """

    def __init__(self, app: ASGIApp, settings: Settings) -> None:
        self.app, self.settings = app, settings

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Answer or refuse one request."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        started = False
        overrun: list[Refused] = []

        async def sending(message: Message) -> None:
            nonlocal started
            if overrun and not started:  # whatever the application makes of a body that broke off
                started = True
                await _refuse(overrun[0], send)
            if overrun:
                return
            if message["type"] == "http.response.start":
                started = True
                message = {**message, "headers": _with_security(list(message.get("headers", [])))}
            await send(message)

        try:
            headers = dict(scope["headers"])
            self._check_host(headers.get(b"host"))
            _check_origin(headers)
            self._check_length(headers.get(b"content-length"))
            await self.app(scope, self._counted(receive, overrun), sending)
        except Refused as refusal:
            if started:
                raise
            overrun.clear()
            await _refuse(refusal, sending)

    def _check_host(self, host: bytes | None) -> None:
        if host is None:
            raise Refused(400, "the request does not say which host it is for")
        if _name_of(host.decode("latin-1")) not in self.settings.hosts:
            raise Refused(
                403, "the request is for another host; open the page under the address that acidity serve printed"
            )

    def _check_length(self, length: bytes | None) -> None:
        if length is None:
            return
        if not length.isdigit():
            raise Refused(400, "the length of the request is not a number")
        if int(length) > self.settings.max_body:
            raise Refused(_TOO_LARGE, self._too_large())

    def _too_large(self) -> str:
        return f"more than {self.settings.max_body >> 20} MiB in one request; cut the file into parts"

    def _counted(self, receive: Receive, overrun: list[Refused]) -> Receive:
        """Pass the body on while it is within its limits of size and time; note where it is not."""
        size = 0
        complete = False

        async def receiving() -> Message:
            nonlocal size, complete
            if complete:
                return await receive()  # waits for the client to leave
            try:
                message = await asyncio.wait_for(receive(), self.settings.body_seconds)
            except TimeoutError:
                overrun.append(Refused(408, "the request did not arrive in time; send it again"))
                raise overrun[0] from None
            if message["type"] == "http.request":
                size += len(message.get("body", b""))
                complete = not message.get("more_body", False)
                if size > self.settings.max_body:
                    overrun.append(Refused(_TOO_LARGE, self._too_large()))
                    raise overrun[0]
            return message

        return receiving


def _name_of(host: str) -> str:
    """Host without port, in lower case; brackets of IPv6 stay."""
    host = host.strip().lower()
    if host.startswith("["):
        return host.partition("]")[0] + "]"
    return host.partition(":")[0]


def _check_origin(headers: dict[bytes, bytes]) -> None:
    site = headers.get(b"sec-fetch-site", b"")
    if site in (b"cross-site", b"same-site") and headers.get(b"sec-fetch-mode") != b"navigate":
        raise Refused(403, "the request comes from another page; only this page may ask")
    origin = headers.get(b"origin")
    if origin is None:
        return
    try:
        parts = urlsplit(origin.decode("latin-1"))
        same = parts.scheme in ("http", "https") and parts.netloc.lower() == headers[b"host"].decode("latin-1").lower()
    except ValueError:
        same = False
    if not same:
        raise Refused(403, "the request comes from another page; only this page may ask")


def _with_security(headers: list[tuple[bytes, bytes]]) -> list[tuple[bytes, bytes]]:
    present = {name.lower() for name, _ in headers}
    headers += [(name, value) for name, value in _SECURITY if name not in present]
    if b"content-security-policy" not in present:
        headers.append((b"content-security-policy", _POLICY))
    if b"cache-control" not in present:
        headers.append((b"cache-control", b"no-store"))
    return headers


async def _refuse(refusal: Refused, send: Send) -> None:
    body = json.dumps({"detail": refusal.sentence}).encode()
    headers = [
        (b"content-type", b"application/json"),
        (b"content-length", str(len(body)).encode()),
        (b"connection", b"close"),  # the rest of the body is not read
    ]
    await send({"type": "http.response.start", "status": refusal.status, "headers": _with_security(headers)})
    await send({"type": "http.response.body", "body": body})
