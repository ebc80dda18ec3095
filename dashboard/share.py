"""Sharing a desk on the network: links that each let one browser in, and a refusal for everybody else."""

from __future__ import annotations

import secrets
import socket
from collections.abc import Iterable
from typing import Any

from tornado.httputil import HTTPServerRequest
from tornado.routing import Matcher, Rule
from tornado.web import Application, RequestHandler

EVERYWHERE = "0.0.0.0"
WARNING = (
    "Shared on the network. Whoever opens one of these links first sees the whole review, can write queries and keep views in it.\n"
    "What is sent is not encrypted: share on a network that you trust. The links end with this desk."
)
_WITHOUT = "This desk is shared by links that each let one person in. Ask whoever runs it for a link of your own."
_SPENT = "This link has let somebody in already, or it never was one. Ask whoever runs the desk for another."


class Gate:
    """Who may come in: unused links, and the browsers that have used one. Both are forgotten when the desk stops.

    Parameters
    ----------
    links : int
        How many links there are, one a person.
    port : int
        Names the cookie: browsers keep one store for all ports of a machine.
    """

    def __init__(self, links: int, port: int) -> None:
        self.links = [secrets.token_urlsafe(24) for _ in range(links)]
        self.cookie = f"leewater-{port}"
        self._unused, self._inside = set(self.links), set[str]()

    def admit(self, link: str) -> str | None:
        """Use a link up: a new secret for its cookie, or None where the link is no good (any more)."""
        if not _among(link, self._unused):
            return None
        self._unused.discard(link)
        secret = secrets.token_urlsafe(24)
        self._inside.add(secret)
        return secret

    def knows(self, request: HTTPServerRequest) -> bool:
        """Whether a request brings the cookie of somebody who was let in."""
        morsel = request.cookies.get(self.cookie)
        return morsel is not None and _among(morsel.value, self._inside)


def _among(given: str, known: Iterable[str]) -> bool:
    """Compared in a time that tells nothing about how much of it is right."""
    return any([secrets.compare_digest(given.encode(), k.encode()) for k in known])


def _page(sentence: str) -> str:
    return (
        '<!DOCTYPE html><html lang="en"><meta charset="utf-8"><meta name="viewport" content="width=device-width">'
        f"<title>Leewater</title><main><h1>Leewater</h1><p>{sentence}</p></main></html>"
    )


class _Stranger(Matcher):
    """Takes every request without the cookie, whatever it asks for: pages, files, the websocket."""

    def __init__(self, gate: Gate) -> None:
        self.gate = gate

    def match(self, request: HTTPServerRequest) -> dict[str, Any] | None:
        return None if self.gate.knows(request) else {}


class _Refusal(RequestHandler):
    """One plain sentence."""

    def prepare(self) -> None:
        self.set_status(403)
        self.set_header("Cache-Control", "no-store")
        self.finish(_page(_WITHOUT))


class _Door(RequestHandler):
    """Exchanges a link for a cookie, once."""

    def initialize(self, gate: Gate) -> None:
        self.gate = gate

    def get(self, link: str) -> None:
        self.set_header("Cache-Control", "no-store")
        if not self.gate.knows(self.request):  # the browser that used the link may open it again
            secret = self.gate.admit(link)
            if secret is None:
                self.set_status(403)
                self.finish(_page(_SPENT))
                return
            self.set_cookie(self.gate.cookie, secret, path="/", httponly=True, samesite="Lax")
        self.redirect("/", status=303)


def guard(application: Application, gate: Gate) -> None:
    """Let an application answer only those who came in by the gate."""
    application.add_handlers(r".*", [(r"/share/([\w-]+)", _Door, {"gate": gate}), Rule(_Stranger(gate), _Refusal)])


def addresses() -> list[str]:
    """This machine's addresses in the network, the one that leads outwards first.

    Raises ``ValueError`` where there is none.
    """
    found = []
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as probe:
        try:
            probe.connect(("192.0.2.1", 9))  # an address kept for documents (RFC 5737); nothing is sent
            found.append(probe.getsockname()[0])
        except OSError:
            pass
    try:
        found += socket.gethostbyname_ex(socket.gethostname())[2]
    except OSError:
        pass
    outward = [a for a in dict.fromkeys(found) if not a.startswith("127.")]
    if not outward:
        raise ValueError("this machine has no address in a network; connect it to one, or leave --share out.")
    return outward


def words(gate: Gate, here: str, there: list[str], port: int) -> str:
    """What is printed: the warning, the owner's link (the first) and one for each guest."""
    own, *guests = gate.links
    lines = [WARNING, f"  on this machine   http://{here}:{port}/share/{own}"]
    lines += [f"  guest {k:<11} http://{there[0]}:{port}/share/{link}" for k, link in enumerate(guests, 1)]
    if len(there) > 1:
        lines.append(f"  (guests of another network use {', '.join(there[1:])} in place of {there[0]})")
    return "\n".join(lines)
