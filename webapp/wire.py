"""The wire between browser and session: plain messages both ways, without the delay of a widget's property."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

from panel.custom import JSComponent
from panel.models.esm import ESMEvent


class Wire(JSComponent):  # type: ignore[misc]
    """Hands what the browser says to `heard`, and what the session says to `assets/page.js`."""

    _esm = Path(__file__).parent / "assets" / "wire.js"

    def __init__(self, heard: Callable[[Any], None], **params: Any) -> None:
        super().__init__(**params)
        self._heard = heard

    def _handle_msg(self, data: Any) -> None:
        self._heard(data)

    def tell(self, **parts: Any) -> None:
        """Send parts of the page, each plain data under its name."""
        text = json.dumps(parts, ensure_ascii=False, allow_nan=False)
        for model, _ in self._models.values():
            # Not _send_msg: this way the message travels with the changes of the figures made under the same lock.
            model.document.callbacks.send_event(ESMEvent(model=model, data=text))
