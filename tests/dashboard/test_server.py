"""The desk answers this machine only, with a policy that lets no foreign script run."""

from __future__ import annotations

import json
import re
import socket

import pytest

from dashboard import server, theme
from dashboard.wire import WEB


def test_pages_get_a_nonce_on_every_script_and_the_policy_that_names_it():
    policy = server.Policy(None)
    headers = {"Content-Type": "text/html; charset=UTF-8", "Content-Length": "1"}
    page = b'<html><script src="/a.js"></script><script type="module">x</script><scripted></scripted></html>'
    _, headers, chunk = policy.transform_first_chunk(200, headers, page, True)
    nonces = re.findall(rb'<script nonce="([^"]+)"', chunk)
    assert len(nonces) == 2 and len(set(nonces)) == 1
    assert f"'nonce-{nonces[0].decode()}'" in headers["Content-Security-Policy"]
    assert "unsafe-eval" not in headers["Content-Security-Policy"]
    assert headers["Content-Length"] == str(len(chunk))
    assert b"<scripted>" in chunk


def test_what_is_no_page_is_passed_on_as_it_is():
    headers = {"Content-Type": "text/javascript"}
    assert server.Policy(None).transform_first_chunk(200, headers, b"<script", True) == (200, headers, b"<script")


def test_a_port_in_use_is_refused_when_asked_for_and_left_when_not():
    with socket.socket() as taken:
        taken.bind((server.HOST, 0))
        taken.listen()
        port = taken.getsockname()[1]
        with pytest.raises(ValueError, match=f"port {port} is in use"):
            server.free_port(port)
    assert server.free_port(None) > 0


def test_every_file_that_the_worker_stores_is_there():
    for address in server.stored_files():
        if address in ("/web/theme.css", "/manifest.webmanifest"):
            continue
        folder = WEB / "icons" if address.startswith("/icons/") else WEB
        assert (folder / address.split("/", 2)[2]).is_file(), address


def test_the_worker_s_version_moves_with_its_files(tmp_path, monkeypatch):
    before = re.search(r'VERSION = "(\w{16})"', server.worker_script())
    assert before
    copy = tmp_path / "web"
    copy.mkdir()
    for path in WEB.rglob("*"):
        if path.is_file():
            target = copy / path.relative_to(WEB)
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_bytes(path.read_bytes())
    (copy / "desk.css").write_text("/* another */", encoding="utf-8")
    monkeypatch.setattr(server, "WEB", copy)
    after = re.search(r'VERSION = "(\w{16})"', server.worker_script())
    assert after and after[1] != before[1]


def test_the_manifest_names_icons_of_the_two_sizes_that_installing_asks_for():
    icons = {i["sizes"] for i in json.loads(json.dumps(server.manifest()))["icons"]}
    assert {"192x192", "512x512"} <= icons


def test_the_stylesheet_holds_every_colour_of_every_look():
    css = theme.stylesheet()
    for palette in (theme.LIGHT, theme.DARK, theme.HALL):
        for colour in (palette.paper, palette.ink, palette.signal, palette.ground):
            assert colour in css


def test_no_file_of_the_page_names_another_machine_or_runs_text_as_code():
    """Fonts, scripts and styles come from here; nothing needs unsafe-eval. The SVG namespace is a name, not an address."""
    for path in WEB.rglob("*"):
        if path.suffix in (".html", ".css", ".js", ".svg"):
            text = path.read_text(encoding="utf-8").replace("http://www.w3.org/2000/svg", "")
            assert not re.search(r"https?://|//[a-z0-9.-]+\.[a-z]{2,}/", text), path
            assert not re.search(r"\beval\(|new Function|\son[a-z]+=", text), path
