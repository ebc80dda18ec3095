"""The fixtures of this folder notice what they are there to notice."""

from __future__ import annotations

import pytest
from playwright.sync_api import Error, Page

from tests.browser.conftest import Watch

pytestmark = pytest.mark.browser


def test_a_request_to_another_machine_is_noted_and_gets_no_answer(page: Page, watch: Watch):
    page.set_content("<p>here</p>")
    refused = page.evaluate("fetch('http://example.org/x').then(() => 'answered', () => 'refused')")
    assert refused == "refused"
    assert watch.outside == ["http://example.org/x"]
    watch.outside.clear()
    watch.errors.clear()  # the browser complains of the failed request


def test_a_page_cannot_be_opened_from_another_machine(page: Page, watch: Watch):
    with pytest.raises(Error, match="ERR_NAME_NOT_RESOLVED"):
        page.goto("http://example.org/")
    watch.outside.clear()


def test_errors_of_the_page_and_its_console_are_noted(page: Page, watch: Watch):
    page.evaluate("console.error('wrong'); setTimeout(() => { throw new Error('worse') })")
    page.evaluate("new Promise(done => setTimeout(done))")
    assert [error.splitlines()[0] for error in watch.errors] == ["wrong", "worse"]
    watch.errors.clear()
