"""A visitor comes: what the address asks for, the page, and a session of its own."""

from __future__ import annotations

from pathlib import Path

import panel as pn

from transport import ScenarioError
from webapp.app import Session
from webapp.bench import Bench
from webapp.link import Shown, decode
from webapp.service import Service
from webapp.theme import css_variables

_PAGE = Path(__file__).parent / "page.html"


def _linked(text: bytes) -> tuple[Shown | None, str]:
    """What the link of an address shows, or a sentence that says why nothing."""
    if not text:
        return None, ""
    try:
        return decode(text.decode("ascii", "replace")), ""
    except ScenarioError as error:
        return None, f"The link cannot be opened: {error}"


def session(service: Service) -> None:
    """Fill the document of one visitor; called by the server for each."""
    document = pn.state.curdoc
    wanted = pn.state.session_args.get("scenario", [b""])[0].decode(errors="replace")
    drags = "Mobi" not in pn.state.headers.get("User-Agent", "")
    document.title = "Colonnade"
    document.template = _PAGE.read_text(encoding="utf-8")
    document.template_variables.update(
        variables=css_variables(), has_login=service.has_login, view_only=service.view_only)
    share = service.enter()
    document.on_session_destroyed(lambda context: service.leave(share))
    # One look at all models instead of one for each root halves the time to the page.
    with document.models.freeze():
        linked, refused = _linked(pn.state.session_args.get("bench", [b""])[0])
        bench = Bench(service.folder, wanted or None, linked.document if linked else None)
        if refused:
            bench.refuse("open", refused)
        visit = Session(document, bench, drags, share, linked)
        for figure in visit.board.figures:
            document.add_root(figure)
        document.template_variables["figures"] = [figure.name for figure in visit.board.figures]
        visit.wire.server_doc(document, location=False)
    document.on_session_destroyed(lambda context: visit.close())
