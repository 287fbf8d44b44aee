"""Nothing but the login page and the health address is served to who is not logged in, by any way."""

from __future__ import annotations

import http.client
import json
import re
import shutil
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from urllib.parse import urlencode, urlsplit

import pytest
from bokeh.util.token import generate_jwt_token, generate_session_id, get_token_payload

from tests.browser.conftest import Served, serving
from webapp.environment import CHECKOUT
from webapp.passwords import hashed

PASSWORD = "heron over the mill"


@pytest.fixture(scope="module")
def shut(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Served]:
    place = tmp_path_factory.mktemp("shut")
    (place / "users").write_text(f"ada:{hashed(PASSWORD)}\nbob:{hashed(PASSWORD[::-1])}\n")
    folder = Path(shutil.copytree(CHECKOUT / "scenarios", place / "scenarios"))
    with serving(folder, "--auth-file", str(place / "users"), "--origin", "bench.example.org",
                 "--behind-proxy") as server:
        yield server


@dataclass
class Client:
    """Asks a server, keeping cookies; `address`: the visitor's, as a proxy in front would give it."""

    served: Served
    address: str = "192.0.2.1"
    cookies: dict[str, str] = field(default_factory=dict)
    set_cookies: list[str] = field(default_factory=list)

    def ask(self, method: str, path: str, body: str | None = None, **headers: str) -> tuple[int, str]:
        """Status and body of an answer; what it has for a redirection stands in the body."""
        connection = http.client.HTTPConnection(urlsplit(self.served.address).netloc, timeout=20)
        told = {"X-Real-Ip": self.address, **{name.replace("_", "-"): value for name, value in headers.items()}}
        if self.cookies:
            told["Cookie"] = "; ".join(f"{name}={value}" for name, value in self.cookies.items())
        if body is not None:
            told["Content-Type"] = "application/x-www-form-urlencoded"
        connection.request(method, path, body, told)
        answer = connection.getresponse()
        for line in answer.headers.get_all("Set-Cookie") or []:
            self.set_cookies.append(line)
            name, _, value = line.partition(";")[0].partition("=")
            self.cookies[name] = value
        text = "" if answer.status == 101 else answer.read().decode()
        connection.close()
        return answer.status, answer.headers.get("Location") or text

    def log_in(self, name: str = "ada", password: str = PASSWORD, query: str = "") -> tuple[int, str]:
        """Fill in the login page."""
        page = self.ask("GET", "/login")[1]
        token = re.search(r'name="_xsrf" value="([^"]+)"', page)
        assert token is not None
        return self.ask("POST", "/login", urlencode(
            {"_xsrf": token[1], "name": name, "password": password, "query": query}))

    def websocket(self, origin: str | None = None) -> int:
        """The status that opening a websocket with a good token is answered with; 101: it is open."""
        token = generate_jwt_token(generate_session_id(), signed=False)
        return self.ask("GET", "/ws", Connection="Upgrade", Upgrade="websocket", Sec_WebSocket_Version="13",
                        Sec_WebSocket_Key="AAAAAAAAAAAAAAAAAAAAAA==", Sec_WebSocket_Protocol=f"bokeh, {token}",
                        Origin=origin or self.served.address)[0]


SHUT = ["/ws", "/autoload.js?bokeh-autoload-element=x", "/metadata", "/assets/page.css", "/assets/page.js",
        "/static/js/bokeh.min.js", "/static/extensions/panel/panel.min.js", "/favicon.ico", "/components/a/b/c/d",
        "//login", "/login/", "/assets/../login", "/absent", "/logout"]


@pytest.mark.parametrize("path", SHUT)
def test_without_a_login_nothing_else_is_served(shut: Served, path: str) -> None:
    for client in (Client(shut), Client(shut, cookies={"colonnade-login": "2|1:0|10:1|15:colonnade-login|4:YWJj|00"})):
        assert client.ask("GET", path)[0] == 403
    assert Client(shut).ask("POST", path, "")[0] == 403


def test_the_page_sends_to_the_login_and_back_with_its_arguments(shut: Served) -> None:
    client = Client(shut)
    status, place = client.ask("GET", "/?scenario=mill-race.toml")
    assert (status, place) == (302, "login?query=scenario%3Dmill-race.toml")
    assert 'value="scenario=mill-race.toml"' in client.ask("GET", f"/{place}")[1]
    assert client.log_in(query="scenario=mill-race.toml") == (303, "./?scenario=mill-race.toml")
    assert client.ask("GET", "/login?query=scenario%3Dmill-race.toml") == (303, "./?scenario=mill-race.toml")


def test_after_the_login_page_assets_and_websocket_are_served_and_after_the_logout_no_more(shut: Served) -> None:
    client = Client(shut)
    assert client.websocket() == 403
    assert client.log_in() == (303, "./")
    assert client.ask("GET", "/")[0] == 200
    assert client.ask("GET", "/assets/page.css")[0] == 200
    assert client.websocket() == 101
    kept = dict(client.cookies)
    assert client.ask("POST", "/logout", "") == (303, "login")
    assert "colonnade-login" not in client.cookies or not client.cookies["colonnade-login"].strip('"')
    # Who has kept the cookie has kept nothing.
    later = Client(shut, cookies=kept)
    assert later.websocket() == 403
    assert later.ask("GET", "/")[0] == 302


def test_a_page_of_another_server_cannot_connect_and_one_that_is_named_can(shut: Served) -> None:
    client = Client(shut)
    client.log_in()
    assert client.websocket("https://elsewhere.example.org") == 403
    assert client.websocket("https://bench.example.org") == 101


def test_the_cookies_are_closed_to_scripts_and_other_sites_and_secure_where_the_proxy_has_tls(shut: Served) -> None:
    client = Client(shut)
    client.log_in()
    assert {line.partition("=")[0] for line in client.set_cookies} == {"_xsrf", "colonnade-login"}
    for line in client.set_cookies:
        assert "httponly" in line.lower() and "samesite" in line.lower()
        assert "secure" not in line.lower()
    tls = Client(shut, cookies={"_xsrf": client.cookies["_xsrf"]})
    tls.ask("POST", "/login", urlencode({"_xsrf": client.cookies["_xsrf"], "name": "ada", "password": PASSWORD}),
            X_Scheme="https")
    assert "secure" in tls.set_cookies[-1].lower()


def test_the_page_does_not_hold_the_cookie(shut: Served) -> None:
    client = Client(shut)
    client.log_in()
    page = client.ask("GET", "/")[1]
    token = re.search(r'"token":"([^"]+)"', page)
    assert token is not None and client.cookies["colonnade-login"].strip('"') not in page
    payload = get_token_payload(token[1])
    assert payload["cookies"] == {} and set(payload["headers"]) <= {"User-Agent"}


def test_a_form_of_another_site_logs_nobody_in(shut: Served) -> None:
    assert Client(shut).ask("POST", "/login", urlencode({"name": "ada", "password": PASSWORD}))[0] == 403
    stranger = Client(shut, cookies={"_xsrf": "made-up"})
    assert stranger.ask("POST", "/login", urlencode({"_xsrf": "other", "name": "ada", "password": PASSWORD}))[0] == 403


def test_nothing_typed_into_the_login_becomes_markup(shut: Served) -> None:
    client = Client(shut, address="192.0.2.8")
    status, page = client.log_in(name='"><script>alert(1)</script>', query='"><b>')
    assert status == 403
    assert "<script>alert" not in page and '"><b>' not in page


def test_repeated_failures_must_wait_and_others_need_not(shut: Served) -> None:
    client = Client(shut, address="192.0.2.9")
    # A slow machine may outlast the first waits of a second or two; each is twice as long as the one before.
    answers = [client.log_in(password="a wrong guess")]
    while answers[-1][0] != 429 and len(answers) < 12:
        answers.append(client.log_in(password="a wrong guess"))
    assert [status for status, _ in answers[:5]] == [403] * 5 and answers[-1][0] == 429
    assert "wait" in answers[-1][1]
    assert client.log_in()[0] == 429
    assert Client(shut, address="192.0.2.10").log_in()[0] == 303


def test_the_log_tells_of_refusals_without_passwords_or_unknown_names(shut: Served) -> None:
    client = Client(shut, address="192.0.2.11")
    client.log_in(name="mistyped password", password="another secret")
    client.log_in(name="bob", password="another secret")
    refused = [line for line in shut.events() if line["event"] == "login refused"]
    told = [line["what"] for line in refused]
    assert "an unknown name from 192.0.2.11, status 403" in told
    assert "bob from 192.0.2.11, status 403" in told
    written = shut.log.read_text()
    assert "mistyped" not in written and "another secret" not in written and PASSWORD not in written


def test_the_health_address_needs_no_login(shut: Served) -> None:
    client = Client(shut)
    status, text = client.ask("GET", "/liveness")
    before = json.loads(text)
    assert status == 200 and re.fullmatch(r"\d+\.\d+\.\d+", before["version"])
    client.log_in()
    client.ask("GET", "/")
    assert json.loads(client.ask("GET", "/liveness")[1])["sessions"] == before["sessions"] + 1


def test_every_line_of_the_log_has_the_same_fields(shut: Served) -> None:
    events = shut.events()
    assert events[0]["event"] == "started"
    for line in events:
        assert {"time", "level", "event", "session", "what"} == set(line)
    client = Client(shut)
    client.log_in()
    client.ask("GET", "/")
    opened = [line["session"] for line in shut.events() if line["event"] == "session opened"]
    assert opened == list(range(1, len(opened) + 1))


def test_the_file_of_users_is_not_served(shut: Served) -> None:
    client = Client(shut)
    client.log_in()
    for path in ("/users", "/assets/../users", "/assets/../../users", "/assets/%2e%2e/passwords.py"):
        assert client.ask("GET", path)[0] in (403, 404)
    assert Path(shut.folder.parent / "users").exists()
