"""Packs are made from the desk in the review's exports, can be stopped, and nothing else is served from there."""

from __future__ import annotations

import contextlib
import threading
from pathlib import Path

import pytest
import tornado.httpclient
from tornado.httpserver import HTTPServer
from tornado.ioloop import IOLoop
from tornado.testing import bind_unused_port
from tornado.web import Application

from dashboard.pack import gather, write_folder
from dashboard.packs import Packs
from dashboard.reading import Reading
from dashboard.results import Working
from dashboard.server import PackFile
from dashboard.views import pack_list

from .pack.reviews import PERSON, small_review

LONG = 300.0  # s: on a busy machine with nothing compiled


@pytest.fixture(scope="module")
def review(tmp_path_factory):
    return small_review(tmp_path_factory.mktemp("packs") / "review")


@pytest.fixture
def packs(review):
    reading = Reading(review.folder)
    with contextlib.suppress(Working):
        reading.matter()
    assert reading.results.wait(LONG)
    return Packs(reading)


def test_a_pack_is_made_in_the_exports_and_tells_how_far_it_is(packs, review):
    shares: list[float] = []
    packs.reading.long.listen(lambda key: shares.extend(m.share for m in packs.making.values()))
    packs.make("public")
    assert packs.reading.long.wait(LONG)
    assert packs.trouble == {} and packs.making == {}
    assert [p.name for p in packs.finished()] == ["pack-public"]
    assert (review.folder / "exports" / "pack-public" / "index.html").is_file()
    assert PERSON not in (review.folder / "exports" / "pack-public" / "index.html").read_text("utf-8")
    assert shares == sorted(shares) and shares[0] == 0 and shares[-1] == 1 and len(set(shares)) > 5


def test_a_pack_that_is_stopped_leaves_nothing_behind(packs, review):
    begun, go = threading.Event(), threading.Event()

    def hold(key) -> None:
        if packs.making.get("team") and packs.making["team"].share > 0:
            begun.set()
            go.wait(LONG)

    packs.reading.long.listen(hold)
    packs.make("team")
    assert begun.wait(LONG)
    packs.stop("team")
    go.set()
    assert packs.reading.long.wait(LONG)
    assert packs.making == {} and packs.trouble == {}
    assert not (review.folder / "exports" / "pack-team").exists()


def test_a_folder_that_holds_something_else_is_left_and_told(packs, review):
    other = review.folder / "exports" / "pack-team"
    other.mkdir(parents=True)
    (other / "notes.txt").write_text("mine", encoding="utf-8")
    packs.make("team")
    assert packs.reading.long.wait(LONG)
    assert "holds something that is no pack" in packs.trouble["team"]
    assert [p.name for p in other.iterdir()] == ["notes.txt"]
    assert "holds something" in pack_list.html(packs.finished(), packs.making, packs.trouble)
    (other / "notes.txt").unlink()
    other.rmdir()


def test_an_unknown_kind_is_refused(packs):
    with pytest.raises(ValueError, match="choose public or team"):
        packs.make("press")


@pytest.fixture
def site(packs, review):
    """The server's way to packs, alone; secrets lie beside and above the pack."""
    exports = review.folder / "exports"
    if not (exports / "pack-shown").exists():
        write_folder(gather(review.folder), exports / "pack-shown")
        (exports / "secret.txt").write_text("beside", encoding="utf-8")
        (exports / "pack-notes").mkdir()
        (exports / "pack-notes" / "secret.txt").write_text("no pack", encoding="utf-8")
        (exports / "pack-shown" / "way-out.txt").symlink_to(review.folder / "review.toml")
    ask: dict[str, tuple[int, str, dict]] = {}

    def serve(paths: list[str]) -> dict[str, tuple[int, str, dict]]:
        async def run() -> None:
            socket, port = bind_unused_port()
            server = HTTPServer(Application([(r"/pack/(pack-.*)", PackFile, {"packs": packs})]))
            server.add_sockets([socket])
            client = tornado.httpclient.AsyncHTTPClient()
            for path in paths:
                answer = await client.fetch(f"http://127.0.0.1:{port}{path}", raise_error=False)
                ask[path] = (answer.code, answer.body.decode("utf-8", "replace"), dict(answer.headers))
            server.stop()
            client.close()

        loop = IOLoop(make_current=False)
        try:
            loop.run_sync(run)
        finally:
            loop.close(all_fds=True)
        return ask

    return serve


def test_a_finished_pack_is_served_with_its_own_policy(site):
    answers = site(["/pack/pack-shown/index.html", "/pack/pack-shown/", "/pack/pack-shown/data/pack.js"])
    assert [code for code, _, _ in answers.values()] == [200, 200, 200]
    policy = answers["/pack/pack-shown/index.html"][2]["Content-Security-Policy"]
    assert "script-src 'self';" in policy and "nonce" not in policy and "unsafe-eval" not in policy


@pytest.mark.parametrize("path", [
    "/pack/pack-shown/../secret.txt", "/pack/pack-shown/%2e%2e/secret.txt", "/pack/pack-shown/..%2f..%2freview.toml",
    "/pack/pack-notes/secret.txt", "/pack/pack-nothing/index.html", "/pack/pack-shown/way-out.txt", "/pack/pack-..%2fsecret.txt",
    "/pack/pack-shown/%2e%2e/%2e%2e/lines.gpkg",
])
def test_nothing_beside_a_pack_is_served(site, path: str):
    code, body, _ = site([path])[path]
    assert code in (403, 404)
    assert "beside" not in body and "no pack" not in body.replace("There is no such pack here", "") and "[[runs]]" not in body


def test_where_there_is_no_review_the_exports_are_nowhere(tmp_path: Path):
    from hydro.review import SAMPLE

    file = tmp_path / "alone.nc"
    file.write_bytes((SAMPLE / "results" / "existing_bankfull_coarse.nc").read_bytes())
    reading = Reading(file)
    with contextlib.suppress(Working):
        reading.matter()
    assert reading.results.wait(LONG)
    alone = Packs(reading)
    assert alone.folder is None and alone.finished() == []
    with pytest.raises(ValueError, match="leewater pack"):
        alone.make("public")
