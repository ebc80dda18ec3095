"""The served desk: this machine only unless it is shared, every byte from here, installable, with a strict content policy."""

from __future__ import annotations

import hashlib
import json
import logging
import os
import re
import secrets
import socket
import threading
import webbrowser
from collections.abc import Sequence
from pathlib import Path
from typing import Any

os.environ["BOKEH_RESOURCES"] = "server"  # before bokeh is imported: a user's own value could name other machines

import panel as pn  # noqa: E402
from tornado.web import HTTPError, OutputTransform, RequestHandler, StaticFileHandler  # noqa: E402
from tornado.websocket import WebSocketClosedError  # noqa: E402

from . import share, theme  # noqa: E402
from .pack import is_pack  # noqa: E402
from .packs import Packs  # noqa: E402
from .page import Page  # noqa: E402
from .reading import Reading  # noqa: E402
from .results import Working  # noqa: E402
from .site import Site  # noqa: E402
from .studies import Studies  # noqa: E402
from .wire import WEB  # noqa: E402

HOST, PORT = "127.0.0.1", 5377
_STARTED = secrets.token_hex(8)
_POLICY = (
    "default-src 'none'; script-src 'self' 'nonce-{nonce}'; style-src 'self' 'unsafe-inline'; img-src 'self' data: blob:; "
    "font-src 'self' data:; connect-src 'self' blob:; manifest-src 'self'; worker-src 'self'; base-uri 'none'; "
    "form-action 'none'; frame-ancestors 'none'"
)

_PACK_POLICY = _POLICY.replace(" 'nonce-{nonce}'", "")


class Policy(OutputTransform):
    """Adds a nonce to every script of a page and sends the content policy with it.

    Pages are sent whole in one chunk; one that is not gets no nonce and so runs no script. A page that comes
    with a policy of its own keeps it.
    """

    def __init__(self, request) -> None:
        pass

    def transform_first_chunk(self, status_code, headers, chunk, finishing):
        if headers.get("Content-Type", "").startswith("text/html") and "Content-Security-Policy" not in headers:
            nonce = secrets.token_urlsafe(16)
            chunk = re.sub(rb"<script(?=[\s>])", f'<script nonce="{nonce}"'.encode(), chunk)
            if "Content-Length" in headers:
                headers["Content-Length"] = str(len(chunk))
            headers["Content-Security-Policy"] = _POLICY.format(nonce=nonce)
            headers["X-Content-Type-Options"] = "nosniff"
            headers["Referrer-Policy"] = "no-referrer"
        return status_code, headers, chunk


class Ping(RequestHandler):
    """Tells that the desk is there, and which one: a page of an older one draws itself anew."""

    def get(self) -> None:
        self.set_header("Cache-Control", "no-store")
        self.finish({"started": _STARTED})


class Theme(RequestHandler):
    """The theme's colours as CSS."""

    def get(self) -> None:
        self.set_header("Content-Type", "text/css; charset=utf-8")
        self.set_header("Cache-Control", "no-cache")
        self.finish(theme.stylesheet())


class Worker(RequestHandler):
    """The service worker, stamped with a version made of everything it stores."""

    def get(self) -> None:
        self.set_header("Content-Type", "text/javascript; charset=utf-8")
        self.set_header("Cache-Control", "no-cache")
        self.finish(worker_script())


class Manifest(RequestHandler):
    """What an installed desk is called and shows."""

    def get(self) -> None:
        self.set_header("Content-Type", "application/manifest+json")
        self.finish(json.dumps(manifest()))


class Web(StaticFileHandler):
    """Our own files: asked for anew each time, so that a new version is seen at once."""

    def set_extra_headers(self, path: str) -> None:
        self.set_header("Cache-Control", "no-cache")
        if path.endswith(".woff2"):
            self.set_header("Content-Type", "font/woff2")


class Picture(RequestHandler):
    """A site photograph of the review, made anew without its tags."""

    def initialize(self, site: Site) -> None:
        self.site = site

    def get(self, number: str) -> None:
        try:
            content = self.site.picture(int(number))
        except (Working, ValueError, OSError):
            raise HTTPError(404) from None
        self.set_header("Content-Type", "image/jpeg")
        self.set_header("Cache-Control", "no-cache")
        self.set_header("X-Content-Type-Options", "nosniff")
        self.finish(content)


class PackFile(StaticFileHandler):
    """A file of a finished pack, from the review's exports and nowhere else."""

    def initialize(self, packs: Packs) -> None:  # type: ignore[override]
        self.packs = packs
        super().initialize("", "index.html")

    def prepare(self) -> None:
        """Find the exports, which are known once the review is open."""
        try:
            folder = self.packs.folder
        except (Working, ValueError, OSError):
            folder = None
        if folder is None:
            raise HTTPError(404)
        self.root = str(folder)

    def validate_absolute_path(self, root: str, absolute_path: str) -> str | None:
        """Only what truly lies, links followed, in a folder that is a pack."""
        exports, wanted = Path(root).resolve(), Path(absolute_path).resolve()
        inside = wanted.relative_to(exports).parts if wanted.is_relative_to(exports) else ()
        if not inside or not is_pack(exports / inside[0]):
            raise HTTPError(404)
        return super().validate_absolute_path(str(exports / inside[0]), str(wanted))

    def write_error(self, status_code: int, **kwargs: Any) -> None:
        """One sentence in place of a bare number."""
        self.set_header("Content-Type", "text/plain; charset=utf-8")
        self.finish("There is no such pack here; make one under Record.\n" if status_code == 404 else f"{status_code}\n")

    def set_extra_headers(self, path: str) -> None:
        self.set_header("Cache-Control", "no-cache")
        self.set_header("Content-Security-Policy", _PACK_POLICY)
        self.set_header("X-Content-Type-Options", "nosniff")
        self.set_header("Referrer-Policy", "no-referrer")


def manifest() -> dict:
    """The web app manifest."""
    return {
        "id": "/", "name": "Leewater", "short_name": "Leewater", "start_url": "/", "scope": "/", "display": "standalone",
        "description": "Review desk for depth-averaged river models", "background_color": theme.LIGHT.paper,
        "theme_color": theme.LIGHT.ink,
        "icons": [
            {"src": f"/icons/leewater-{size}.png", "sizes": f"{size}x{size}", "type": "image/png", "purpose": "any"}
            for size in (192, 512)
        ] + [{"src": "/icons/leewater.svg", "sizes": "any", "type": "image/svg+xml"}],
    }


def stored_files() -> list[str]:
    """Addresses that the worker stores at once."""
    web = ["/web/offline.html", "/web/offline.js", "/web/stored.js", "/web/desk.css", "/web/theme.css", "/manifest.webmanifest"]
    fonts = [f"/web/fonts/{p.name}" for p in sorted((WEB / "fonts").glob("*.woff2"))]
    return web + fonts + [f"/icons/{p.name}" for p in sorted((WEB / "icons").iterdir())]


def worker_script() -> str:
    """sw.js with its version: a hash of the libraries' versions and of our own files."""
    import bokeh

    digest = hashlib.sha256(f"{bokeh.__version__} {pn.__version__} {theme.stylesheet()}".encode())
    for path in sorted(p for p in WEB.rglob("*") if p.is_file()):
        digest.update(path.read_bytes())
    files = ", ".join(json.dumps(f) for f in stored_files())
    text = (WEB / "sw.js").read_text(encoding="utf-8")
    return text.replace("{{version}}", digest.hexdigest()[:16]).replace("{{files}}", files)


def page_for(studies: Studies) -> pn.Template:
    """A new viewer's page."""
    document = pn.state.curdoc
    location = pn.state.location
    assert document is not None  # Panel makes one for every viewer

    def later(function) -> None:
        document.add_next_tick_callback(function)

    page = Page(studies, location.search if location is not None else "", later)
    template = pn.Template((WEB / "index.html").read_text(encoding="utf-8"))
    template.add_panel("map", pn.pane.Bokeh(page.map.figure, sizing_mode="stretch_both"))
    template.add_panel("twin", pn.pane.Bokeh(page.twin.figure, sizing_mode="stretch_both"))
    template.add_panel("wire", page.wire)
    template.add_variable("slots", {**dict.fromkeys(_SLOTS, ""), **page.screen.slots})
    document.title = "Leewater"
    pn.state.on_session_destroyed(lambda _: page.close())
    return template


_SLOTS = (
    "title", "rail", "foot", "asks", "answer", "status", "key", "scale", "alternative", "caption", "ribbon", "progress",
    "section", "table", "body", "cautions", "places", "parcel", "photograph", "which", "twin",
)


def free_port(wanted: int | None, host: str = HOST) -> int:
    """The wanted port, else the usual one, else any that is free; a wanted one in use is refused.

    An installed desk looks for the usual port, so another one is said aloud by :func:`serve`.
    """
    for port in [wanted] if wanted is not None else [PORT, 0]:
        with socket.socket() as probe:
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            try:
                probe.bind((host, port))
                return probe.getsockname()[1]
            except OSError:
                continue
    raise ValueError(f"port {wanted} is in use; give another with --port, or leave it out.")


def serve(path: Path | str, *, port: int | None = None, browser: bool = True, guests: int = 0) -> None:
    """Serve the desk for a review or a results file until it is stopped.

    With ``guests`` it is shared on the network, by one link a guest; without, only this machine reaches it.
    Raises ``ValueError`` when the wanted port is in use, or where there is no network to share on.
    """
    there = share.addresses() if guests else []
    chosen = free_port(port, share.EVERYWHERE if guests else HOST)
    gate = share.Gate(1 + guests, chosen) if guests else None
    reading = Reading(path)
    application = make_server(reading, chosen, gate, there)
    address = f"http://{HOST}:{chosen}/" + (f"share/{gate.links[0]}" if gate else "")
    if port is None and chosen != PORT:
        print(f"Port {PORT} is in use (another desk?); this one is at another port, where an installed desk does not look.")
    print(f"Leewater shows {path} at http://{HOST}:{chosen}/  (stop with Ctrl+C)", flush=True)
    if gate is not None:
        print(share.words(gate, HOST, there, chosen), flush=True)
    if browser:
        threading.Timer(0.3, webbrowser.open, (address,)).start()
    application.start()
    try:
        application.io_loop.start()
    except KeyboardInterrupt:
        print("Leewater has stopped.")
    finally:
        application.stop()


def _not_a_closed_page(record: logging.LogRecord) -> bool:
    """A viewer who closes the page while something is being sent is no fault."""
    return not (record.exc_info and isinstance(record.exc_info[1], WebSocketClosedError))


def make_server(reading: Reading, port: int, gate: share.Gate | None = None, there: Sequence[str] = ()):
    """The server for a reading, not yet started; the first opening of the path begins at once.

    With a ``gate`` it listens to the network, at the addresses ``there``, and answers only those who came in by it.
    """
    logging.getLogger("bokeh.server.views.ws").setLevel(logging.ERROR)
    logging.getLogger("asyncio").addFilter(_not_a_closed_page)
    try:
        reading.matter()
    except Exception:  # being opened: the page says how far it is, and what went wrong if it does
        pass
    studies = Studies(reading)
    static = {"path": str(WEB)}
    server = pn.serve(
        {"/": lambda: page_for(studies)}, address=share.EVERYWHERE if gate else HOST, port=port, show=False, start=False, title="Leewater",
        websocket_origin=[f"{host}:{port}" for host in (HOST, *there)], admin=False, check_unused_sessions_milliseconds=2000,
        unused_session_lifetime_milliseconds=20_000,
        extra_patterns=[
            (r"/ping", Ping), (r"/sw\.js", Worker), (r"/manifest\.webmanifest", Manifest), (r"/web/theme\.css", Theme),
            (r"/web/(.*)", Web, static), (r"/icons/(.*)", Web, {"path": str(WEB / "icons")}),
            (r"/photograph/(\d+)", Picture, {"site": studies.site}),
            (r"/pack/(pack-.*)", PackFile, {"packs": studies.packs}),
        ],
    )
    server._tornado.transforms.append(Policy)
    if gate is not None:
        share.guard(server._tornado, gate)
    return server


__all__ = ["HOST", "PORT", "make_server", "serve"]
