"""The first screen in a real browser: it answers, its parts move together, and a link opens the same view."""

from __future__ import annotations

import re

import pytest
from playwright.sync_api import Browser, Page, expect

from .conftest import Server, Watch
from .desk import FLOOD, PATIENCE, answer, colours, faults, open_desk, plain, settled

pytestmark = pytest.mark.browser


def test_the_sample_opens_with_a_sentence_a_map_and_a_ledger(page: Page, server: Server):
    open_desk(page, server.address)
    assert re.search(r"edd(y|ies) turns? in this (mean flow|frame)", answer(page))
    assert re.search(r"covers [\d.,]+ m\u00b2", answer(page))
    assert colours(page) > 60
    assert page.locator("table tbody tr").count() >= 1
    assert "depth-averaged" in page.inner_text("footer.cautions")
    assert page.locator("nav button").count() >= 7


def test_the_page_title_and_the_one_heading_of_first_rank(page: Page, server: Server):
    open_desk(page, server.address)
    assert page.title() == "Eddies \u00b7 Leewater"
    assert page.locator("h1").count() == 1


def test_time_moves_the_map_the_sentence_and_the_address(page: Page, server: Server):
    open_desk(page, server.address, FLOOD)
    before, words = answer(page), page.get_attribute("#time", "aria-valuetext")
    page.focus("#time")
    page.keyboard.press("Home")
    expect(page.locator("#time")).not_to_have_attribute("aria-valuetext", words or "")
    settled(page)
    assert answer(page) != before
    assert "seconds=0" in page.url
    assert plain(page.inner_text(".side")).count("m\u00b3/s") >= 2


def test_a_press_on_the_ribbon_takes_the_cursor_there(page: Page, server: Server):
    open_desk(page, server.address, f"{FLOOD}&seconds=0")
    box = page.locator("#ribbon svg").bounding_box()
    assert box is not None
    page.mouse.click(box["x"] + 0.6 * box["width"], box["y"] + 0.4 * box["height"])
    page.wait_for_function("() => /seconds=[1-9]/.test(location.search)")
    assert page.input_value("#time") != "0"


def test_a_row_of_the_ledger_takes_the_map_there(page: Page, server: Server):
    open_desk(page, server.address)
    row = page.locator("table tbody tr:not(.subject) button.row").first
    name = plain(row.inner_text())
    row.click()
    expect(page.locator("tr.subject button.row")).to_have_text(re.compile(name))
    settled(page)
    assert name in answer(page)
    assert f"subject={name}" in page.url
    assert "view=" in page.url


def test_a_link_opens_the_same_view(page: Page, server: Server, browser: Browser):
    open_desk(page, server.address, FLOOD)
    page.click("button[data-do=zoom][data-value=nearer]")
    page.select_option("#choose-tubes", "44")
    page.wait_for_function("() => location.search.includes('tubes=44')")
    settled(page)
    there = browser.new_context(viewport={"width": 1440, "height": 900}).new_page()
    open_desk(there, page.url.replace("/?", "?").split("?")[0].rstrip("/"), page.url.split("?", 1)[1])
    assert answer(there) == answer(page)
    assert there.input_value("#choose-tubes") == "44"
    assert there.url == page.url
    there.context.close()


def test_back_undoes_and_forward_does_it_again(page: Page, server: Server):
    open_desk(page, server.address)
    page.select_option("#choose-shade", "depth")
    expect(page.locator(".key")).to_contain_text("Depth")
    page.click("button[data-do=undo]")
    expect(page.locator(".key")).to_contain_text("Speed")
    page.keyboard.press("Control+Shift+Z")
    expect(page.locator(".key")).to_contain_text("Depth")
    page.go_back()
    expect(page.locator(".key")).to_contain_text("Speed")


def test_a_dragged_section_reads_anew(page: Page, server: Server):
    open_desk(page, server.address)
    before = plain(page.inner_text(".figures"))
    box = page.locator("#end-left").bounding_box()
    assert box is not None
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    page.mouse.move(x, y)
    page.mouse.down()
    page.mouse.move(x + 40, y + 60, steps=5)
    page.mouse.up()
    expect(page.locator(".figures")).not_to_have_text(before)
    assert "section=" in page.url


def test_the_section_ends_move_by_keys(page: Page, server: Server):
    open_desk(page, server.address)
    url = page.url
    page.focus("#end-right")
    for _ in range(3):
        page.keyboard.press("Shift+ArrowLeft")
    page.wait_for_function("url => location.href !== url", arg=url)
    assert "section=" in page.url


def test_units_change_everywhere_at_once(page: Page, server: Server):
    open_desk(page, server.address)
    page.select_option("#units", "US survey feet")
    expect(page.locator("#answer")).to_contain_text("US ft")
    text = plain(page.inner_text("main"))
    assert not re.search(r"\d (m|m\u00b2|m\u00b3/s|m/s)\b", text), text


@pytest.mark.parametrize("query", ["", "mode=night", "hall=yes", "mode=night&hall=yes"], ids=["day", "night", "hall", "hall night"])
@pytest.mark.parametrize("width", [1440, 1024, 390])
def test_axe_finds_nothing(page: Page, server: Server, query: str, width: int):
    page.set_viewport_size({"width": width, "height": 900})
    open_desk(page, server.address, query)
    assert faults(page) == []


@pytest.mark.parametrize("width", [1280, 1024, 390])
def test_the_page_reflows_without_scrolling_sideways(page: Page, server: Server, width: int):
    page.set_viewport_size({"width": width, "height": 844})
    open_desk(page, server.address)
    assert page.evaluate("document.documentElement.scrollWidth") <= width


def test_every_control_is_reached_by_tab_and_shows_its_focus(page: Page, server: Server):
    """Tab from the top meets each button, list and slider once; each has an outline while it is there."""
    open_desk(page, server.address)
    wanted = page.evaluate(
        """() => [...document.querySelectorAll('button, select, input, summary, #map, a[href]')]
            .filter((e) => !e.disabled && (e.tagName === 'SUMMARY' || !e.closest('details:not([open])'))
                && e.getClientRects().length && getComputedStyle(e).visibility === 'visible').length"""
    )
    met = set()
    page.evaluate("document.activeElement.blur()")
    for _ in range(wanted + 15):
        page.keyboard.press("Tab")
        where = page.evaluate(
            """() => {
                const e = document.activeElement;
                if (e === document.body) return null;
                window.walked = window.walked || new Map();
                if (!window.walked.has(e)) window.walked.set(e, window.walked.size);
                const ring = [e, e.querySelector('span'), e.closest('#ribbon')].some(
                    (x) => x && getComputedStyle(x).outlineStyle !== 'none' && parseFloat(getComputedStyle(x).outlineWidth) >= 2);
                return [window.walked.get(e), ring, e.outerHTML.slice(0, 120)];
            }"""
        )
        if where is None:
            continue
        met.add(where[0])
        assert where[1], f"no focus ring on {where[2]}"
    assert len(met) >= wanted


def test_every_question_says_something_without_an_error(page: Page, server: Server):
    open_desk(page, server.address)
    for key in ("arrival", "drift", "passage", "sections", "change", "record", "eddies"):
        page.click(f"nav button[data-value={key}]:visible")
        # The first time, loops are being compiled under the page; what counts is that the click is not lost.
        expect(page.locator("nav li button[aria-current=page]")).to_have_attribute("data-value", key, timeout=150_000)
        settled(page)
        assert len(answer(page)) > 15
        assert faults(page) == []


def test_an_address_that_cannot_be_read_is_told_and_the_page_still_opens(page: Page, server: Server):
    open_desk(page, server.address, "view=here")
    assert "cannot be read" in page.inner_text(".status")
    assert colours(page) > 60


def test_two_browsers_keep_their_own_state(page: Page, server: Server, browser: Browser, watch: Watch):
    open_desk(page, server.address)
    other = browser.new_context(viewport={"width": 1440, "height": 900}).new_page()
    watch.follow(other)
    open_desk(other, server.address)
    page.select_option("#choose-shade", "depth")
    expect(page.locator(".key")).to_contain_text("Depth")
    assert "Speed" in other.inner_text(".key")
    other.context.close()


@pytest.mark.parametrize("width", [1440, 1024])
def test_in_the_hall_the_cautions_stand_in_view_however_long_the_page(page: Page, server: Server, width: int):
    page.set_viewport_size({"width": width, "height": 768})
    open_desk(page, server.address, "question=sections&hall=yes")
    page.evaluate("window.scrollTo(0, 0)")
    last = page.locator("footer.cautions li").last.bounding_box()
    assert last and last["y"] + last["height"] <= 768
    assert page.evaluate("document.documentElement.scrollHeight") > 768, "the page is longer than the screen, else this proves nothing"
    side, picture = page.locator(".side").bounding_box(), page.locator("#map").bounding_box()
    assert side and picture and side["x"] >= picture["x"] + picture["width"]


def test_the_section_s_end_and_the_key_do_not_cover_each_other(page: Page, server: Server):
    apart = (
        "() => { const a = document.querySelector('#end-left span').getBoundingClientRect(), b = document.querySelector('#map .key')"
        ".getBoundingClientRect(); return a.right <= b.left || b.right <= a.left || a.bottom <= b.top || b.bottom <= a.top; }"
    )
    open_desk(page, server.address)
    page.wait_for_function(apart)
    key, ring = page.locator("#map .key").bounding_box(), page.locator("#end-left").bounding_box()
    assert key and ring
    page.mouse.move(ring["x"] + 22, ring["y"] + 22)
    page.mouse.down()
    page.mouse.move(key["x"] + key["width"] / 2, key["y"] + key["height"] / 2, steps=4)
    page.mouse.up()
    page.wait_for_function("x => document.querySelector('#end-left').getBoundingClientRect().x < x", arg=key["x"] + key["width"])
    page.wait_for_function(apart)
    settled(page)
    assert page.evaluate(apart)


def test_a_parcel_is_let_go_by_a_press_by_key_and_by_its_coordinates(page: Page, server: Server):
    open_desk(page, server.address, "question=eddies&view=52455,31178,120")
    box, told = page.locator("#map").bounding_box(), page.locator("p.parcel")
    assert box
    page.mouse.click(box["x"] + 0.5 * box["width"], box["y"] + 0.5 * box["height"])
    expect(told).to_contain_text("Parcel let go at", timeout=90_000)
    expect(told).to_contain_text("not for judging swimming, boating or rescue")
    assert "parcel=" in page.url
    settled(page)
    first = told.inner_text()
    page.click("button[data-key=parcel-away]")
    expect(told).to_be_hidden()
    page.focus("#map")
    page.keyboard.press("Enter")
    expect(told).to_contain_text("Parcel let go at", timeout=90_000)
    places = [[float(v) for v in re.findall(r"at ([\d.]+), ([\d.]+)", plain(words))[0]] for words in (first, told.inner_text())]
    assert places[0] == pytest.approx(places[1], abs=0.5)  # a press is a whole pixel
    page.click("summary:has-text('let a parcel go')")
    page.fill("#parcel-x", "here")
    page.fill("#parcel-y", "31120")
    page.click("form[data-send=parcel] button")
    expect(page.locator(".status").first).to_contain_text("the place is not two numbers")
    page.fill("#parcel-x", "52000")
    page.keyboard.press("Enter")
    expect(told).to_contain_text("there is no water there", timeout=90_000)
    settled(page)
    assert faults(page) == []


def test_the_divider_between_two_runs_moves_by_key_and_pointer_and_shows_each_run_on_its_side(page: Page, server: Server):
    view = "question=change&run=existing_bankfull&view=52530.70,31271.61,90.00"
    open_desk(page, server.address, f"{view}&compared=swipe&divider=0.5")
    page.wait_for_selector("#map-alternative:has-text('Left of the divider')", state="attached", timeout=PATIENCE)
    divider = page.get_by_role("slider", name="Divider between the two runs")
    divider.focus()
    page.keyboard.press("Shift+ArrowRight")
    page.wait_for_url("**divider=0.6*", timeout=PATIENCE)
    assert divider.get_attribute("aria-valuetext") == "Existing, bankfull on the left 60 % of the map, Proposed, bankfull on the rest"
    page.keyboard.press("Home")
    page.wait_for_url("**divider=0", timeout=PATIENCE)
    assert divider.get_attribute("aria-valuenow") == "0"
    page.keyboard.press("End")
    page.wait_for_url("**divider=1", timeout=PATIENCE)
    box, at = page.locator("#map").bounding_box(), divider.bounding_box()
    assert box and at
    page.mouse.move(at["x"] + 10, at["y"] + at["height"] / 3)
    page.mouse.down()
    page.mouse.move(box["x"] + 0.25 * box["width"], at["y"] + at["height"] / 3, steps=4)
    page.mouse.up()
    page.wait_for_url("**divider=0.25*", timeout=PATIENCE)
    assert faults(page) == []


def test_a_sentence_of_the_comparison_takes_the_map_to_its_place_by_key(page: Page, server: Server):
    open_desk(page, server.address, "question=change&run=existing_bankfull")
    sentence = page.get_by_role("button", name=re.compile("The eddy Pier 1, left rear"))
    sentence.wait_for(timeout=PATIENCE)
    sentence.focus()
    page.keyboard.press("Enter")
    page.wait_for_url("**,120.00*", timeout=PATIENCE)
    east, north, _ = (float(v) for v in re.search(r"view=([\d.]+),([\d.]+),([\d.]+)", page.url).groups())
    assert abs(east - 52530) < 40 and abs(north - 31271) < 40  # the piers' surroundings


def test_two_runs_stand_side_by_side_in_one_view_and_one_time(page: Page, server: Server):
    ranges = (
        "() => ['map-figure', 'twin-figure'].map((n) => { const f = Bokeh.documents[0].get_model_by_name(n);"
        " return [f.x_range.start, f.x_range.end, f.y_range.start, f.y_range.end].map((v) => Math.round(100 * v)); })"
    )
    open_desk(page, server.address, f"{FLOOD}&question=sections&view=52455,31178,120")
    expect(page.locator("#twin")).to_be_hidden()
    page.select_option("#alongside", "proposed_flood")
    expect(page.locator("#twin-which")).to_contain_text("Proposed, flood", timeout=90_000)
    settled(page)
    first, second = page.locator("#map").bounding_box(), page.locator("#twin").bounding_box()
    assert first and second
    assert second["x"] >= first["x"] + first["width"] and second["width"] == pytest.approx(first["width"], abs=1)
    page.click("button[data-do=zoom][data-value=farther]")
    settled(page)
    a, b = page.evaluate(ranges)
    assert a == b
    before = page.inner_text("#twin-which")
    page.focus("#time")
    page.keyboard.press("Home")
    expect(page.locator("#twin-which")).not_to_have_text(before, timeout=90_000)
    when = [re.search(r"\d\d:\d\d(:\d\d)?", page.inner_text(place)) for place in (".pair #map .which", "#twin-which")]
    assert when[0] and when[1] and when[0][0] == when[1][0]
    settled(page)
    assert "alongside=proposed_flood" in page.url
    assert faults(page) == []
    page.set_viewport_size({"width": 1024, "height": 900})
    settled(page)
    first, second = page.locator("#map").bounding_box(), page.locator("#twin").bounding_box()
    assert first and second and second["y"] >= first["y"] + first["height"]
    page.select_option("#alongside", "")
    expect(page.locator("#twin")).to_be_hidden()
