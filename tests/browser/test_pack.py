"""The pack in a real browser: from a file, served, installed and without its server."""

from __future__ import annotations

import contextlib
import json
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from playwright.sync_api import Browser, Page, expect

from dashboard.pack import gather, write_folder, write_single
from dashboard.raster import View, canvas
from hydro.ledger.frames import FrameReader
from hydro.queries import queries, read_written
from hydro.tracks import pathlines
from tests.dashboard.pack.reviews import QUERY, TITLE, small_review

from .conftest import OURS, Watch, end, free_port, launch_options
from .desk import faults, plain

pytestmark = pytest.mark.browser
READY, LOADED = "html[data-ready=yes]", "html[data-loaded]"


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> SimpleNamespace:
    """A public pack, a team's, and each in one file."""
    folder = tmp_path_factory.mktemp("pack")
    review = small_review(folder / "review")
    public = gather(review.folder)
    write_folder(public, folder / "public")
    team = gather(review.folder, team=True)
    write_folder(team, folder / "team")
    write_single(public, folder / "pack.html")
    write_single(team, folder / "team.html")
    return SimpleNamespace(
        review=review, public=folder / "public", team=folder / "team", single=folder / "pack.html", team_single=folder / "team.html",
    )


def opened(page: Page, path: Path) -> Page:
    page.goto(path.as_uri())
    page.wait_for_selector(READY, state="attached")
    page.wait_for_selector(LOADED, state="attached")
    return page


def colours(page: Page) -> int:
    """How many colours the map holds; a blank one has one or two."""
    return page.evaluate(
        "() => { const c = document.getElementById('map-picture'), d = new Uint32Array(c.getContext('2d')"
        ".getImageData(0, 0, c.width, c.height).data.buffer); return new Set(d).size; }"
    )


@pytest.mark.parametrize("form", ["folder", "one file"])
def test_it_opens_from_a_file_and_draws(made, page: Page, form: str):
    opened(page, made.public / "index.html" if form == "folder" else made.single)
    assert colours(page) > 40
    assert "turn" in plain(page.inner_text("#answer"))
    assert page.locator("#table caption").count() == 1 and page.locator("#table tbody tr").count() >= 1
    assert page.locator("#section svg").count() == 1
    for words in ("no vertical roller", "not for judging swimming, boating or rescue"):
        expect(page.locator("#cautions")).to_contain_text(words)


def test_the_title_that_tries_to_be_a_script_is_text(made, page: Page):
    opened(page, made.team / "index.html")
    expect(page.locator("header b")).to_have_text(TITLE)
    expect(page.locator("#queries")).to_contain_text(QUERY)
    assert page.evaluate("window.harmed") is None


def test_the_policy_stops_a_script_that_got_in(made, page: Page, watch: Watch):
    opened(page, made.public / "index.html")
    page.evaluate("() => { const s = document.createElement('script'); s.textContent = 'window.harmed = 4'; document.body.append(s); }")
    assert page.evaluate("window.harmed") is None
    assert len(watch.errors) == 1 and "Content Security Policy" in watch.errors.pop()


def test_time_moves_sentence_table_section_and_map_by_key(made, page: Page):
    opened(page, made.public / "index.html")
    page.focus("#time")
    page.keyboard.press("Home")
    page.wait_for_selector("html[data-frame='0']", state="attached")
    before = {name: page.inner_html(f"#{name}") for name in ("answer", "table", "section", "ribbon-picture")}
    spoken, picture = page.get_attribute("#time", "aria-valuetext"), page.evaluate("document.getElementById('map-picture').toDataURL()")
    page.keyboard.press("End")
    page.wait_for_selector("html[data-frame='8']", state="attached")
    for name, old in before.items():
        assert page.inner_html(f"#{name}") != old, name
    assert page.get_attribute("#time", "aria-valuetext") != spoken
    assert page.evaluate("document.getElementById('map-picture').toDataURL()") != picture


def test_the_ribbon_follows_the_pointer(made, page: Page):
    opened(page, made.public / "index.html")
    box = page.locator("#ribbon-picture").bounding_box()
    places, width = page.evaluate("() => [PAGE.places().places, PAGE.places().width]")
    page.mouse.click(box["x"] + places[3] * box["width"] / width, box["y"] + 30)
    page.wait_for_selector("html[data-frame='3']", state="attached")
    assert page.input_value("#time") == "3"


def test_a_row_of_the_ledger_becomes_the_subject(made, page: Page):
    opened(page, made.public / "index.html")
    row = page.locator("#table tbody tr:has(button)").last
    name = row.get_attribute("data-value")
    row.locator("button").press("Enter")
    expect(page.locator("#answer em.subject")).to_have_text(name)
    expect(page.locator(f"#table tr[data-value={name}] button")).to_have_attribute("aria-pressed", "true")


def test_saved_views_are_walked_through(made, page: Page):
    opened(page, made.public / "index.html")
    page.click("#stop-next")
    expect(page.locator("#stop-words")).to_have_text("The river before it rises.")
    page.keyboard.press("PageDown")
    expect(page.locator("#stop-words")).to_have_text("A minute later.")
    page.wait_for_selector("html[data-frame='6']", state="attached")
    assert page.evaluate("PAGE.state.width") == pytest.approx(300.0)
    expect(page.locator("#stop-next")).to_be_disabled()


def test_the_water_is_painted_as_the_desk_paints_it_at_any_scale(made, page: Page):
    """The desk's raster is the second method. What may differ: pixels whose centre lies on an edge or a tube's limit."""
    opened(page, made.public / "index.html")
    run = made.review.open("flood")
    reader = FrameReader(run, reach=made.review.reach_for(run), sensitivity=False)
    entry = reader.frame(5)
    west, south = run.mesh.bounds[:2]
    top, tube, centre = page.evaluate(
        "async () => { await PAGE.show(5); const { content } = PAGE.item; return [PAGE.head.top, content.tube,"
        " content.zones.find((z) => z.id === content.subject).centre]; }"
    )
    for width in (700.0, 60.0):
        view = View(west + centre[0], south + centre[1], width, 300, 200)
        extent = view.extent
        seen = page.evaluate(
            "([west, north, step]) => { const out = new Uint32Array(60000); WATER.paint(out, { west, north, step, columns: 300, rows: 200 },"
            " PAGE.mesh, PAGE.item.field, PAGE.head.top, Uint32Array.from({ length: 256 }, (_, i) => i)); return Array.from(out); }",
            [extent[0] - west, extent[3] - south, view.step],
        )
        frame = entry.frame
        want = canvas(run.mesh).index(view).paint(frame, frame.speed, top, psi=entry.sf.psi, tube=tube, carries=entry.sf.domain)
        ours = np.array(seen, int).reshape(200, 300)[::-1]
        want = want.astype(int)
        same = (ours == 0) == (want == 0)
        water = (ours > 0) & (want > 0)
        odd = (ours > 127) == (want > 127)
        shade = np.abs((ours - 1) % 127 - (want - 1) % 127)
        assert water.sum() > 3000
        assert same.mean() > 0.998
        assert odd[water].mean() > 0.995
        assert np.percentile(shade[water], 99) <= 1


def test_a_parcel_drifts_as_hydros_own_pathlines_do(made, page: Page):
    """hydro.tracks traces the run's full digits, the page its whole numbers. What is left between them grows
    along a path, fastest at walls and stagnation points: half of the parcels must agree to 2 cm, nine in ten to
    20 cm, after up to 80 s and more than a hundred metres."""
    opened(page, made.public / "index.html")
    run = made.review.open("flood")
    boundaries = FrameReader(run, reach=made.review.reach_for(run), sensitivity=False).frame(0).sf.open_boundaries
    wet = np.flatnonzero(run.frame(0).wet_triangles)
    starts = run.mesh.triangle_centroid[np.random.default_rng(7).choice(wet, 40, replace=False)]
    corner = np.array(run.mesh.bounds[:2])
    tracks = page.evaluate(
        "async (starts) => { await PAGE.show(0); const out = []; for (const [x, y] of starts) out.push(await PAGE.letGo(x, y)); return out; }",
        (starts - corner).tolist(),
    )
    traced = pathlines(run, starts, begin=float(run.times.seconds[0]), end=float(run.times.seconds[-1]), every=0.5, boundaries=boundaries)
    assert max(t.length_m for t in traced.tracks) > 100
    apart = []
    for ours, theirs in zip(tracks, traced.tracks, strict=True):
        both = theirs.seconds <= ours["seconds"][-1]
        x, y = (np.interp(theirs.seconds[both], ours["seconds"], ours[c]) + o for c, o in zip("xy", corner))
        apart.append(np.hypot(x - theirs.xy[both, 0], y - theirs.xy[both, 1]).max())
    print(f"parcels apart, m: median {np.median(apart):.4f}, nine in ten {np.percentile(apart, 90):.3f}, most {max(apart):.2f}")
    assert np.median(apart) < 0.02
    assert np.percentile(apart, 90) < 0.2


def test_a_finger_on_the_water_lets_a_parcel_go(made, browser: Browser, watch: Watch):
    context = browser.new_context(has_touch=True, viewport={"width": 390, "height": 844}, service_workers="block")
    with contextlib.closing(context):
        page = context.new_page()
        watch.follow(page)
        opened(page, made.public / "index.html")
        page.evaluate("PAGE.show(0).then(PAGE.near)")
        box = page.locator("#map").bounding_box()
        x, y = page.evaluate(
            "() => { const v = PAGE.view(), z = PAGE.item.content.zones.find((q) => q.id === PAGE.state.subject); return [v.px(z.centre[0]), v.py(z.centre[1])]; }"
        )
        page.touchscreen.tap(box["x"] + x, box["y"] + y)
        expect(page.locator("#parcel")).to_contain_text("along its path")
        page.locator("#time").press("End")
        expect(page.locator("#parcel")).to_contain_text("1 min 20 s after it was let go")
        expect(page.locator(".public")).to_be_visible()
        page.locator("#map").press("Enter")  # the same by keyboard
        assert page.evaluate("document.documentElement.scrollWidth") <= 390
    assert watch.errors == [] and watch.outside == []


def test_dry_ground_takes_no_parcel(made, page: Page):
    opened(page, made.public / "index.html")
    assert page.evaluate("PAGE.show(0).then(() => PAGE.letGo(5, PAGE.head.size[1] - 5))") is None
    expect(page.locator("#parcel")).to_contain_text("no water there")


def test_a_teams_query_comes_back_into_the_review_once(made, page: Page, tmp_path: Path):
    opened(page, made.team / "index.html")
    page.fill("#query-author", "R. Reader")
    page.fill("#query-text", "Does the bay <b>silt</b> up?")
    page.click("#query-ask")
    expect(page.locator("#query-new")).to_contain_text("Does the bay <b>silt</b> up?")
    with page.expect_download() as waiting:
        page.click("#query-download")
    file = tmp_path / "queries.json"
    waiting.value.save_as(file)
    assert json.loads(file.read_text("utf-8"))["schema"] == "leewater/pack-queries/1"
    numbers = read_written(made.review.folder, file)
    assert [q.text for q in queries(made.review.folder) if q.number in numbers] == ["Does the bay <b>silt</b> up?"]
    assert read_written(made.review.folder, file) == []


@pytest.mark.parametrize("width", [1440, 1024, 390])
def test_axe_finds_nothing_by_day_by_night_and_on_a_projector(made, page: Page, width: int):
    page.set_viewport_size({"width": width, "height": 900})
    opened(page, made.team_single)  # axe fetches style sheets, which a browser refuses between files: here they are inside
    assert faults(page) == []
    page.click("#night")
    assert faults(page) == []
    page.click("#night")
    page.click("#hall")
    assert faults(page) == []


def test_every_control_is_reached_by_tab_and_shows_it(made, page: Page):
    opened(page, made.team / "index.html")
    seen = []
    for _ in range(60):
        page.keyboard.press("Tab")
        name = page.evaluate("() => document.activeElement.id")
        if name in seen:
            continue
        seen.append(name)
    wanted = {"run", "night", "hall", "map", "nearer", "further", "near", "whole", "time", "run-on", "let-go", "sections", "query-text", "query-ask"}
    assert wanted <= set(seen)
    page.focus("#nearer")
    page.keyboard.press("Tab")
    assert page.evaluate("() => getComputedStyle(document.activeElement).outlineStyle") == "solid"


@pytest.fixture
def served(made) -> Iterator[SimpleNamespace]:
    """The pack on a plain web server, which a test may end."""
    port = free_port()
    command = [sys.executable, "-m", "http.server", str(port), "--bind", OURS, "--directory", str(made.public)]
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    yield SimpleNamespace(address=f"http://{OURS}:{port}/", process=process)
    end(process)


def test_served_it_is_installable_and_opens_without_its_server(served, browser: Browser, chromium_path: str, watch: Watch, tmp_path: Path):
    profile = str(tmp_path / "profile")
    with contextlib.closing(browser.browser_type.launch_persistent_context(profile, **launch_options(chromium_path))) as context:
        page = context.pages[0]
        for _ in range(50):  # the server needs a moment to listen
            with contextlib.suppress(Exception):
                page.goto(served.address)
                break
            with contextlib.suppress(subprocess.TimeoutExpired):
                served.process.wait(timeout=0.1)
        watch.follow(page)
        page.wait_for_selector(LOADED, state="attached")
        page.evaluate("navigator.serviceWorker.ready.then(() => true)")
        devtools = context.new_cdp_session(page)
        assert devtools.send("Page.getInstallabilityErrors")["installabilityErrors"] == []
        assert devtools.send("Page.getAppManifest")["errors"] == []
        end(served.process)
        page.reload()
        page.wait_for_selector(LOADED, state="attached")
        assert colours(page) > 40
    assert watch.outside == []
