"""The way in: a login page of our own, and a gate before every route of the server, the websocket's included."""

from __future__ import annotations

import asyncio
import base64
import logging
import math
import secrets
import time
from collections import OrderedDict
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any
from urllib.parse import parse_qsl, urlencode

from bokeh.server.auth_provider import AuthProvider
from tornado.httputil import HTTPServerRequest
from tornado.routing import Matcher, Rule
from tornado.template import Template
from tornado.web import Application, RequestHandler, decode_signed_value

from webapp import log
from webapp.attempts import Attempts
from webapp.passwords import MOST_LENGTH, Users
from webapp.theme import css_variables

LOGIN, LOGOUT, LIVENESS = "/login", "/logout", "/liveness"
OPEN_PATHS = frozenset({LOGIN, LIVENESS})
"""What is served without a login."""
COOKIE = "colonnade-login"
LASTS_S = 12 * 3600
"""How long a login lasts."""
MOST_LOGINS = 10_000

_HERE = Path(__file__).parent
_PAGE = Template((_HERE / "login.html").read_text(encoding="utf-8"), autoescape="xhtml_escape")
_MARK = "data:image/svg+xml;base64," + base64.b64encode((_HERE / "assets" / "mark.svg").read_bytes()).decode()
_MOST_NAME = 64


class Logins:
    """Who is logged in, by the secret their cookie holds; gone when the server stops."""

    def __init__(self, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._names: OrderedDict[str, tuple[str, float]] = OrderedDict()

    def add(self, name: str) -> str:
        """Log a user in; the secret for the cookie."""
        secret = secrets.token_urlsafe(32)
        self._names[secret] = (name, self._clock() + LASTS_S)
        while len(self._names) > MOST_LOGINS:
            self._names.popitem(last=False)
        return secret

    def name(self, secret: str) -> str | None:
        """The user whose secret it is; None where there is none, or the login is too old."""
        name, ends = self._names.get(secret, (None, 0.0))
        return name if self._clock() < ends else None

    def drop(self, secret: str) -> None:
        """Log out."""
        self._names.pop(secret, None)


class Door(AuthProvider):  # type: ignore[misc]
    """Knows who is logged in. Give it to the server, then let it `close` the server's application."""

    def __init__(self, users: Users) -> None:
        self.users, self.logins, self.attempts = users, Logins(), Attempts()
        self.cookie_secret = secrets.token_hex(32)
        # A thread of its own: one password at a time is tried, so that trying many takes neither memory nor cores.
        self.tries = ThreadPoolExecutor(1, thread_name_prefix="password")
        super().__init__()

    @property
    def get_user(self) -> Callable[[RequestHandler], str | None]:
        """The user of a request, asked by the server's own handlers."""
        return lambda handler: self.user(handler.request)

    login_url, logout_url = LOGIN, LOGOUT

    @property
    def login_handler(self) -> type[RequestHandler]:
        """The login page."""
        return _bound(LoginHandler, self)

    @property
    def logout_handler(self) -> type[RequestHandler]:
        """The way out."""
        return _bound(LogoutHandler, self)

    def secret(self, request: HTTPServerRequest) -> str | None:
        """What the cookie of a request holds, if it is one of ours."""
        cookie = request.cookies.get(COOKIE)
        value = decode_signed_value(self.cookie_secret, COOKIE, cookie.value) if cookie else None
        return value.decode() if value else None

    def user(self, request: HTTPServerRequest) -> str | None:
        """The user that a request comes from; None without a login."""
        secret = self.secret(request)
        return self.logins.name(secret) if secret else None

    def close(self, application: Application) -> None:
        """Let nobody past without a login, whatever the route: some of the server's own do not ask."""
        application.add_handlers(r".*", [Rule(_Outside(self), _ShutHandler)])


def _bound(handler: type[RequestHandler], to: Door) -> type[RequestHandler]:
    return type(handler.__name__, (handler,), {"door": to})


class _Outside(Matcher):
    """Matches every request that must not be served."""

    def __init__(self, door: Door) -> None:
        self._door = door

    def match(self, request: HTTPServerRequest) -> dict[str, Any] | None:
        return None if request.path in OPEN_PATHS or self._door.user(request) is not None else {}


class _ShutHandler(RequestHandler):
    """Sends who asks for the page to the login, and refuses all else."""

    def prepare(self) -> None:
        if self.request.method == "GET" and self.request.path == "/" and "Upgrade" not in self.request.headers:
            query = self.request.query
            self.redirect("login" + ("?" + urlencode({"query": query}) if query else ""))
        else:
            self.set_status(403)
            self.finish("Log in first.\n")


class _DoorHandler(RequestHandler):
    """Headers of what stands at the door."""

    door: Door

    def set_default_headers(self) -> None:
        self.nonce = secrets.token_urlsafe(16)
        self.set_header("Cache-Control", "no-store")
        self.set_header("Referrer-Policy", "same-origin")
        self.set_header("Content-Security-Policy", (
            f"default-src 'none'; img-src data:; script-src 'nonce-{self.nonce}'; style-src 'nonce-{self.nonce}'; "
            "form-action 'self'; base-uri 'none'; frame-ancestors 'none'"))


class LoginHandler(_DoorHandler):
    """Shows the login page and hears a name and a password."""

    def get(self) -> None:
        """The page; who is logged in goes on to the bench."""
        if self.door.user(self.request) is not None:
            self._go_on(self.get_query_argument("query", ""))
        else:
            self._show(self.get_query_argument("query", ""))

    async def post(self) -> None:
        """Let in, or say why not."""
        name, address = self.get_body_argument("name", "")[:_MOST_NAME], str(self.request.remote_ip)
        password, query = self.get_body_argument("password", "", strip=False), self.get_body_argument("query", "")
        wait = math.ceil(self.door.attempts.wait(name, address))
        if wait:
            self.set_header("Retry-After", str(wait))
            self._refuse(429, f"Too many attempts: wait {wait} s, then try again.", name, query)
            return
        self.door.attempts.begin(name, address)
        good = len(password) <= MOST_LENGTH and await asyncio.get_running_loop().run_in_executor(
            self.door.tries, self.door.users.admits, name, password)
        if not good:
            self._refuse(403, "Name and password do not belong together.", name, query)
            return
        self.door.attempts.succeed(name, address)
        self.set_signed_cookie(COOKIE, self.door.logins.add(name), expires_days=None, httponly=True, samesite="Lax",
                               secure=self.request.protocol == "https")
        self._go_on(query)

    def _refuse(self, status: int, fault: str, name: str, query: str) -> None:
        # A name that is not known may be a password in the wrong field, so it is not written down.
        who = name if name in self.door.users.hashes else "an unknown name"
        log.tell("login refused", f"{who} from {self.request.remote_ip}, status {status}", level=logging.WARNING)
        self.set_status(status)
        self._show(query, name, fault)

    def _show(self, query: str, name: str = "", fault: str = "") -> None:
        self.finish(_PAGE.generate(
            nonce=self.nonce, mark=_MARK, variables=css_variables(), token=self.xsrf_token, query=query, name=name,
            fault=fault))

    def _go_on(self, query: str) -> None:
        # Taken apart and put together anew: nothing but arguments of our own page can come of it.
        arguments = urlencode(parse_qsl(query))
        self.redirect("./" + (f"?{arguments}" if arguments else ""), status=303)


class LogoutHandler(_DoorHandler):
    """Ends a login."""

    def check_xsrf_cookie(self) -> None:
        """No token is asked: another site's form comes without the login's cookie (SameSite), and does nothing."""

    def post(self) -> None:
        """Log out, and go to the login page."""
        secret = self.door.secret(self.request)
        if secret is not None:
            self.door.logins.drop(secret)
            self.clear_cookie(COOKIE, httponly=True, samesite="Lax")
        self.redirect("login", status=303)
