"""Passwords are kept as hashes only, a bad file is one sentence, and guessing is slowed down."""

from __future__ import annotations

import base64
import getpass
import io
import sys
from pathlib import Path

import pytest

from webapp import passwords
from webapp.__main__ import main
from webapp.attempts import MOST_KEPT, MOST_WAIT_S, Attempts
from webapp.login import LASTS_S, Logins
from webapp.passwords import hashed, read_users

PASSWORD = "heron over the mill"


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """A file for ada, with a comment and an empty line."""
    file = tmp_path / "users"
    file.write_text(f"# those of the first floor\n\nada:{hashed(PASSWORD)}\n")
    return file


def test_a_hash_is_scrypts() -> None:
    # RFC 7914, section 12, third vector: its first 32 bytes, which do not depend on how many are asked for.
    key = bytes.fromhex("7023bdcb3afd7348461c06cd81fd38ebfda8fbba904f8e3ea9b543f6545da1f2")
    salt = base64.b64encode(b"SodiumChloride").decode()
    known = passwords._hash(f"scrypt$16384$8$1${salt}${base64.b64encode(key).decode()}")
    assert known.fits("pleaseletmein")
    assert not known.fits("pleaseletmeIn")


def test_only_name_and_password_together_are_admitted(place: Path) -> None:
    users = read_users(place)
    assert users.admits("ada", PASSWORD)
    for name, password in (("ada", PASSWORD + " "), ("ada", ""), ("bob", PASSWORD), ("Ada", PASSWORD)):
        assert not users.admits(name, password)


def test_the_same_password_has_another_hash_each_time_and_stands_in_none() -> None:
    first, second = str(hashed(PASSWORD)), str(hashed(PASSWORD))
    assert first != second
    assert PASSWORD not in first and base64.b64encode(PASSWORD.encode()).decode() not in first


def test_a_letter_typed_composed_or_not_is_the_same_letter() -> None:
    assert hashed("Stra\u00dfe \u00fcberall").fits("Stra\u00dfe u\u0308berall")


BAD_LINES = [
    "ada", "ada:", "ada:secret of ada", ":scrypt$2$8$1$AAAAAAAAAAA=$AAAA", "a b:scrypt$2", "ada:scrypt$3$8$1$$",
    f"ada:{hashed(PASSWORD)}$", f"ada:{str(hashed(PASSWORD)).replace('32768', '33000')}",
    f"ada:{str(hashed(PASSWORD)).replace('32768', '1073741824')}", f"ada:{str(hashed(PASSWORD))[:-8]}",
]


# Hashes are salted: without names of their own the tests would be others each time.
@pytest.mark.parametrize("line", BAD_LINES, ids=range(len(BAD_LINES)))
def test_a_bad_line_is_one_sentence_with_its_number_and_without_its_content(line: str, tmp_path: Path) -> None:
    file = tmp_path / "users"
    file.write_text(f"# a comment\n{line}\n")
    with pytest.raises(ValueError, match="users, line 2: ") as refused:
        read_users(file)
    assert "\n" not in str(refused.value) and "secret" not in str(refused.value)


def test_a_name_twice_a_file_without_names_and_no_file_are_refused(place: Path, tmp_path: Path) -> None:
    place.write_text(f"ada:{hashed(PASSWORD)}\nada:{hashed(PASSWORD)}\n")
    with pytest.raises(ValueError, match="line 2: ada stands there twice"):
        read_users(place)
    place.write_text("# nobody\n")
    with pytest.raises(ValueError, match="names nobody"):
        read_users(place)
    with pytest.raises(ValueError, match="cannot be read"):
        read_users(tmp_path / "absent")


def typed(text: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Put text on standard input."""
    monkeypatch.setattr(sys, "stdin", io.StringIO(text))


def test_the_command_makes_a_line_that_is_read(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    typed(f"{PASSWORD}\n", monkeypatch)
    assert passwords.main(["ada"]) == 0
    (tmp_path / "users").write_text(capsys.readouterr().out)
    assert read_users(tmp_path / "users").admits("ada", PASSWORD)


def test_the_command_asks_a_terminal_twice_and_takes_only_what_agrees(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    typed("", monkeypatch)
    monkeypatch.setattr(sys.stdin, "isatty", lambda: True)
    answers = iter((PASSWORD, PASSWORD, PASSWORD, PASSWORD[:-1]))
    monkeypatch.setattr(getpass, "getpass", lambda prompt: next(answers))
    assert passwords.main(["ada"]) == 0
    assert passwords.main(["ada"]) == 2
    assert "the two passwords differ" in capsys.readouterr().err


@pytest.mark.parametrize(("name", "password"), [("ada", "short"), ("ada", ""), ("a:b", PASSWORD), ("ada", "x" * 1001)])
def test_the_command_refuses_in_one_sentence(
    name: str, password: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    typed(f"{password}\n", monkeypatch)
    assert passwords.main([name]) == 2
    shown = capsys.readouterr()
    assert shown.out == "" and shown.err.count("\n") == 1


BAD_OPTIONS = [
    ("--auth-file", "/nowhere/users", "cannot be read"),
    ("--jobs", "0", "from 1 to 256"), ("--jobs", "two", "from 1"), ("--jobs", "\u0665", "from 1"),
    ("--jobs-per-session", "-1", "from 1 to 256"),
    ("--most-periods", "0", "at least 1"), ("--most-periods", "2001", "a whole number from 1 to 2,000"),
    ("--origin", "*", "host name"), ("--origin", "https://bench.example.org", "host name"),
    ("--origin", "bench.example.org:99999", "host name"), ("--origin", "", "host name"),
]


@pytest.mark.parametrize(("option", "value", "says"), BAD_OPTIONS)
def test_a_bad_option_is_one_sentence_and_status_two(
    option: str, value: str, says: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    try:
        status: object = main([f"{option}={value}", str(tmp_path)])
    except SystemExit as left:
        status = left.code
    said = capsys.readouterr().err
    assert status == 2
    assert option in said and says in said and said.count("\n") == 1


class Clock:
    """A clock that stands until it is moved."""

    def __init__(self) -> None:
        self.now = 1_000.0

    def __call__(self) -> float:
        return self.now


def fail(attempts: Attempts, times: int, name: str = "ada", address: str = "192.0.2.1") -> None:
    """Fail so many times."""
    for _ in range(times):
        attempts.begin(name, address)


def test_after_five_failures_the_wait_doubles_and_is_forgotten_in_time() -> None:
    clock = Clock()
    attempts = Attempts(clock)
    fail(attempts, 4)
    assert attempts.wait("ada", "192.0.2.1") == 0
    waits = []
    for _ in range(4):
        fail(attempts, 1)
        waits.append(attempts.wait("ada", "192.0.2.1"))
    assert waits == [1, 2, 4, 8]
    assert attempts.wait("ada", "192.0.2.2") == 0
    clock.now += 5
    assert attempts.wait("ada", "192.0.2.1") == 3
    fail(attempts, 20)
    assert attempts.wait("ada", "192.0.2.1") == MOST_WAIT_S
    clock.now += 1_801
    assert attempts.wait("ada", "192.0.2.1") == 0


def test_many_names_from_one_address_and_one_name_from_many_addresses_wait_too() -> None:
    attempts = Attempts(Clock())
    for number in range(20):
        fail(attempts, 1, name=f"guess{number}")
    assert attempts.wait("another", "192.0.2.1") > 0
    for number in range(50):
        fail(attempts, 1, name="bob", address=f"198.51.100.{number}")
    assert attempts.wait("bob", "203.0.113.1") > 0
    assert attempts.wait("carol", "203.0.113.1") == 0


def test_a_success_is_not_counted_and_what_is_kept_is_bounded() -> None:
    attempts = Attempts(Clock())
    for _ in range(100):
        fail(attempts, 1)
        attempts.succeed("ada", "192.0.2.1")
    assert attempts.wait("ada", "192.0.2.1") == 0
    for number in range(MOST_KEPT):
        fail(attempts, 1, name=f"n{number}", address=f"a{number}")
    assert len(attempts._failures) == MOST_KEPT


def test_a_login_ends_with_its_time_or_with_logging_out() -> None:
    clock = Clock()
    logins = Logins(clock)
    first, second = logins.add("ada"), logins.add("ada")
    assert first != second and logins.name(first) == "ada" and logins.name("another") is None
    logins.drop(first)
    assert logins.name(first) is None and logins.name(second) == "ada"
    clock.now += LASTS_S
    assert logins.name(second) is None
