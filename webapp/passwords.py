"""Who may use the page: names and hashed passwords, one NAME:HASH a line; python -m webapp.passwords NAME makes one.

A hash is scrypt$N$r$p$salt$key, after RFC 7914; salt and key in base64.
"""

from __future__ import annotations

import argparse
import base64
import binascii
import getpass
import hashlib
import hmac
import os
import re
import sys
import unicodedata
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

LEAST_LENGTH, MOST_LENGTH = 10, 1_000
"""Characters of a password."""

_NAME = re.compile(r"[A-Za-z0-9][\w.@+-]{0,63}", re.ASCII)
_COST, _BLOCK, _LANES = 2**15, 8, 1
_MOST_MEMORY = 2**28
_KEY_BYTES = 32


@dataclass(frozen=True, slots=True)
class Hash:
    """A password's key, and what it was derived with: scrypt's N, r and p, and the salt."""

    cost: int
    block: int
    lanes: int
    salt: bytes
    key: bytes

    def __str__(self) -> str:
        parts = (str(self.cost), str(self.block), str(self.lanes), *map(_base64, (self.salt, self.key)))
        return "$".join(("scrypt", *parts))

    def fits(self, password: str) -> bool:
        """Whether it is this password's; takes the same time either way."""
        return hmac.compare_digest(self.key, _derived(password, self.cost, self.block, self.lanes, self.salt))


def hashed(password: str) -> Hash:
    """The hash of a password, with a salt of its own. Raises ValueError where it is too short or too long."""
    if not LEAST_LENGTH <= len(password) <= MOST_LENGTH:
        raise ValueError(f"a password must have {LEAST_LENGTH} to {MOST_LENGTH:,} characters; choose another")
    salt = os.urandom(16)
    return Hash(_COST, _BLOCK, _LANES, salt, _derived(password, _COST, _BLOCK, _LANES, salt))


def _derived(password: str, cost: int, block: int, lanes: int, salt: bytes) -> bytes:
    # The same characters may reach us composed or not, as the keyboard has it.
    text = unicodedata.normalize("NFKC", password).encode("utf-8", "surrogatepass")
    return hashlib.scrypt(text, salt=salt, n=cost, r=block, p=lanes, maxmem=2 * _MOST_MEMORY, dklen=_KEY_BYTES)


def _base64(data: bytes) -> str:
    return base64.b64encode(data).decode()


_NOBODY = Hash(_COST, _BLOCK, _LANES, bytes(16), bytes(_KEY_BYTES))


@dataclass(frozen=True, slots=True)
class Users:
    """Those who may use the page."""

    hashes: Mapping[str, Hash]

    def admits(self, name: str, password: str) -> bool:
        """Whether name and password belong together; takes as long for a name that is not known."""
        known = self.hashes.get(name, _NOBODY).fits(password)
        return known and name in self.hashes


def read_users(path: str | os.PathLike[str]) -> Users:
    """The users of a file; empty lines and those that begin with # do not count. Raises ValueError."""
    try:
        lines = Path(path).read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        reason = error.strerror if isinstance(error, OSError) else "it is not UTF-8 text"
        raise ValueError(f"{os.fspath(path)} cannot be read ({reason}); name another file") from None
    hashes: dict[str, Hash] = {}
    for number, line in enumerate(lines, start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        try:
            name, value = _user(line.strip())
            if name in hashes:
                raise ValueError(f"{name} stands there twice; take one line out")
        except ValueError as error:
            raise ValueError(f"{os.fspath(path)}, line {number}: {error}") from None
        hashes[name] = value
    if not hashes:
        raise ValueError(f"{os.fspath(path)} names nobody; python -m webapp.passwords NAME makes a line for it")
    return Users(hashes)


def _user(line: str) -> tuple[str, Hash]:
    name, _, text = line.partition(":")
    return _checked_name(name), _hash(text)


def _checked_name(name: str) -> str:
    if not _NAME.fullmatch(name):
        raise ValueError("a name must be 1 to 64 letters, digits or . _ @ + -, the first a letter or digit")
    return name


def _hash(text: str) -> Hash:
    """The hash that a text writes. Raises ValueError."""
    try:
        kind, *numbers, salt, key = text.split("$")
        cost, block, lanes = map(int, numbers)
        found = Hash(cost, block, lanes, *(base64.b64decode(part, validate=True) for part in (salt, key)))
        good = (kind == "scrypt" and len(found.key) == _KEY_BYTES and len(found.salt) >= 8 and block > 0 and lanes > 0
                and cost > 1 and cost & (cost - 1) == 0 and 128 * cost * block * lanes <= _MOST_MEMORY)
    except (ValueError, binascii.Error):
        good = False
    if not good:
        raise ValueError("must be NAME:HASH with a hash of this program; python -m webapp.passwords NAME makes one")
    return found


def main(arguments: Sequence[str] | None = None) -> int:
    """Print a line for a name; 0 done, 2 bad input."""
    parser = argparse.ArgumentParser(prog="python -m webapp.passwords", description=(
        "Print the line of --auth-file for a name. The password is asked for twice, or read from standard input."))
    parser.add_argument("name", metavar="NAME")
    options = parser.parse_args(arguments)
    try:
        name = _checked_name(options.name)
        sys.stdout.write(f"{name}:{hashed(_asked())}\n")
    except (ValueError, EOFError) as error:
        sys.stderr.write(f"{error or 'no password was given; type one'}\n")
        return 2
    return 0


def _asked() -> str:
    """The password: typed twice without being shown, or one line where standard input is no terminal."""
    if not sys.stdin.isatty():
        return sys.stdin.readline().rstrip("\r\n")
    password = getpass.getpass("Password: ")
    if getpass.getpass("Once more: ") != password:
        raise ValueError("the two passwords differ; start again")
    return password


if __name__ == "__main__":
    sys.exit(main())
