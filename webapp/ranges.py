"""How far the verdict of one session can be trusted: its range first, then the range of every count's margin."""

from __future__ import annotations

from collections.abc import Callable

from transport import Scenario, VerdictRange
from webapp.latest import Latest
from webapp.messages import in_words
from webapp.remedies import Later
from webapp.results import Band
from webapp.service import Visit
from webapp.work import band_of, range_of


class Ranges:
    """Follows the verdict: `tell` gets the range in words, `draw` the range of the margins (None: no range)."""

    def __init__(
        self, tell: Callable[[dict[str, str] | None], None], draw: Callable[[Band | None], None], later: Later,
        visit: Visit,
    ) -> None:
        self._tell, self._draw = tell, draw
        self._ranges = Latest(range_of, later(self._found), later(self._failed), interrupts=True, line=visit.line)
        self._bands = Latest(band_of, later(self._banded), later(self._failed), interrupts=True, line=visit.line)

    def ask(self, scenario: Scenario) -> None:
        """Work out the range of a scenario's verdict."""
        self._bands.cancel()
        self._ranges.ask(scenario)

    def forget(self) -> None:
        """The verdict is another, or none: what is known of its range no longer holds."""
        self._ranges.cancel()
        self._bands.cancel()
        self._tell(None)
        self._draw(None)

    def _found(self, scenario: Scenario, found: VerdictRange | None) -> None:
        self._tell(None if found is None else {"sentence": found.sentence, "assumed": found.assumed})
        if found is not None:
            self._bands.ask((scenario, found))

    def _banded(self, _: object, band: Band | None) -> None:
        self._draw(band)

    def _failed(self, _: object, error: Exception) -> None:
        self._tell({"sentence": in_words(error), "assumed": ""})
