"""A shared desk answers only browsers that came in by a link, and each link lets one in."""

from __future__ import annotations

import contextlib
import http.client
import http.cookies
import os
import re
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from bokeh.util.token import generate_session_id

from dashboard import server, share
from dashboard.reading import Reading
from hydro.review import SAMPLE

ROOT = Path(__file__).resolve().parents[2]
HERE = "127.0.0.1"  # stands for an address in the network, so that the test needs none


@pytest.fixture(scope="module")
def desk() -> Iterator[tuple[str, list[str]]]:
    """`leewater open --share --guests 4` as a process of its own: its address and its links."""
    code = (
        "import sys; from dashboard import share; from dashboard.cli import main; "
        f"share.addresses = lambda: [{HERE!r}]; sys.exit(main())"
    )
    command = [sys.executable, "-c", code, "open", str(SAMPLE), "--share", "--guests", "4", "--no-browser", "--port", "0"]
    process = subprocess.Popen(command, cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True, env=os.environ)
    said, links = [], []
    assert process.stdout is not None
    for line in process.stdout:
        said.append(line)
        links += re.findall(r"http://\S+/share/\S+", line)
        if len(links) == 5:
            break
    assert len(links) == 5, "".join(said)
    assert "not encrypted" in "".join(said)
    yield links[0].split("/share/")[0], links
    process.terminate()
    process.wait(timeout=20)
    process.stdout.close()


@dataclass(frozen=True)
class Answer:
    code: int
    headers: dict[str, str]
    text: str


def asked(address: str, cookie: str = "", method: str = "GET", **headers: str) -> Answer:
    """One request as it is, redirects not followed."""
    parts = urlsplit(address)
    if cookie:
        headers["Cookie"] = cookie
    with contextlib.closing(http.client.HTTPConnection(parts.netloc, timeout=60)) as line:
        line.request(method, parts.path, headers=headers)
        answer = line.getresponse()
        body = b"" if answer.status == 101 else answer.read()
        return Answer(answer.status, dict(answer.getheaders()), body.decode("utf-8", "replace"))


def cookie_of(answer: Answer) -> str:
    jar = http.cookies.SimpleCookie(answer.headers["Set-Cookie"])
    ((name, morsel),) = jar.items()
    assert morsel["httponly"] and morsel["samesite"] == "Lax" and morsel["path"] == "/"
    return f"{name}={morsel.value}"


@pytest.mark.parametrize("path", [
    "/", "/ping", "/sw.js", "/web/desk.css", "/icons/leewater.svg", "/static/js/bokeh.min.js", "/pack/pack-public/index.html",
    "/autoload.js", "/metadata", "/manifest.webmanifest", "/nothing",
])
def test_without_the_cookie_everything_is_refused_with_a_sentence(desk, path: str):
    answer = asked(desk[0] + path)
    assert answer.code == 403
    assert "Ask whoever runs it for a link of your own." in answer.text


def test_a_made_up_cookie_or_link_is_refused(desk):
    port = desk[0].rsplit(":", 1)[1]
    assert asked(desk[0] + "/", f"leewater-{port}=guess").code == 403
    assert asked(desk[0] + "/", f"leewater-{port}=\u00e9").code == 403
    assert asked(desk[0] + "/share/guess").code == 403
    assert asked(desk[0] + "/share/guess", method="HEAD").code in (403, 405)


def test_a_link_lets_one_browser_in_and_then_nobody_else(desk):
    address, links = desk
    first = asked(links[1])
    assert (first.code, first.headers["Location"]) == (303, "/")
    cookie = cookie_of(first)
    inside = asked(address + "/", cookie)
    assert inside.code == 200 and "<title>" in inside.text
    second = asked(links[1])
    assert second.code == 403 and "has let somebody in already" in second.text
    assert "Set-Cookie" not in second.headers
    assert asked(links[1], cookie).code == 303  # the same browser may open it again
    assert asked(address + "/", cookie_of(asked(links[2]))).code == 200  # another guest's link still works


def test_looking_at_a_link_without_opening_it_does_not_use_it_up(desk):
    assert asked(desk[1][3], method="HEAD").code == 405
    assert asked(desk[1][3]).code == 303


def websocket(address: str, cookie: str, origin: str) -> int:
    """The status of a websocket's opening (RFC 6455, section 4): 101 where it is let in."""
    return asked(f"{address}/ws", cookie, **{
        "Upgrade": "websocket", "Connection": "Upgrade", "Sec-WebSocket-Version": "13", "Origin": origin,
        "Sec-WebSocket-Key": "dGhlIHNhbXBsZSBub25jZQ==", "Sec-WebSocket-Protocol": f"bokeh, {token_of(address, cookie)}",
    }).code


def token_of(address: str, cookie: str) -> str:
    """The session's token that the page carries; some other one for a stranger."""
    found = re.search(r'"token":\s*"([^"]+)"', asked(address + "/", cookie).text) if cookie else None
    return found[1] if found else generate_session_id()


def test_the_websocket_wants_the_cookie_and_a_page_of_this_desk(desk):
    address, links = desk
    cookie = cookie_of(asked(links[4]))
    assert websocket(address, "", address) == 403
    assert websocket(address, cookie, "http://elsewhere.example") == 403
    assert websocket(address, cookie, address) == 101


def listening(gate: share.Gate | None) -> set[str]:
    application = server.make_server(Reading(SAMPLE), 0, gate, [HERE] if gate else [])
    try:
        return {s.getsockname()[0] for s in application._http._sockets.values()}
    finally:
        application._http.stop()


def test_only_a_shared_desk_listens_to_the_network():
    assert listening(None) == {"127.0.0.1"}
    assert listening(share.Gate(2, 0)) == {"0.0.0.0"}


def test_a_machine_without_a_network_is_told_so(monkeypatch):
    class Alone(share.socket.socket):
        def connect(self, _) -> None:
            raise OSError("unreachable")

    monkeypatch.setattr(share.socket, "socket", Alone)
    monkeypatch.setattr(share.socket, "gethostbyname_ex", lambda _: ("", [], ["127.0.1.1"]))
    with pytest.raises(ValueError, match="no address in a network"):
        share.addresses()
