"""Slows down the guessing of passwords: after some failures each further one doubles the wait, up to five minutes."""

from __future__ import annotations

import time
from collections import OrderedDict
from collections.abc import Callable, Iterator

MOST_WAIT_S = 300.0
FORGOTTEN_AFTER_S = 1_800.0
MOST_KEPT = 10_000
"""Counts that are kept at most; the oldest goes first."""
_FREE_TOGETHER, _FREE_OF_ADDRESS, _FREE_OF_NAME = 5, 20, 50


class Attempts:
    """Failures of a name at an address, of an address with any names, and of a name at any addresses."""

    def __init__(self, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._failures: OrderedDict[tuple[str, str], tuple[int, float]] = OrderedDict()

    def wait(self, name: str, address: str) -> float:
        """Seconds until the next attempt is heard; 0 where it is heard now."""
        return max(self._wait(key, free) for key, free in _counts(name, address))

    def begin(self, name: str, address: str) -> None:
        """Count an attempt as failed, before its outcome is known: many at once must not all be heard."""
        for key, _ in _counts(name, address):
            self._failures[key] = (self._failures.pop(key, (0, 0.0))[0] + 1, self._clock())
        while len(self._failures) > MOST_KEPT:
            self._failures.popitem(last=False)

    def succeed(self, name: str, address: str) -> None:
        """The attempt was no failure after all."""
        for key, _ in _counts(name, address):
            if key in self._failures:
                count, last = self._failures[key]
                self._failures[key] = (count - 1, last)

    def _wait(self, key: tuple[str, str], free: int) -> float:
        count, last = self._failures.get(key, (0, 0.0))
        since = self._clock() - last
        if count < free or since > FORGOTTEN_AFTER_S:
            return 0.0
        return max(0.0, min(2.0 ** min(count - free, 20), MOST_WAIT_S) - since)


def _counts(name: str, address: str) -> Iterator[tuple[tuple[str, str], int]]:
    """The counts an attempt touches, each with the failures that are free."""
    yield (name, address), _FREE_TOGETHER
    yield ("", address), _FREE_OF_ADDRESS
    yield (name, ""), _FREE_OF_NAME
