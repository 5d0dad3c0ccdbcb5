"""A real browser on the live server: headless Chromium, driven by Playwright, under the strict CSP.

``page_for(user)`` gives a page on which the user has signed in through the form; every page notes policy violations
and script errors in ``page.complaints``, and a test that leaves any there fails.
"""

import os
from collections.abc import Callable, Iterator

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

from tests.browser.chromium import CHROMIUM, FLAGS, WIDE
from tests.factories import PASSWORD

LISTEN = """
document.addEventListener('securitypolicyviolation', (event) => {
  console.error('policy violation: ' + event.violatedDirective + ' ' + event.blockedURI + ' ' + event.sample);
});
"""


@pytest.fixture(scope="package")
def browser() -> Iterator[Browser]:
    """One Chromium for this folder; its driver holds an event loop in the main thread, which ends with it."""
    os.environ["DJANGO_ALLOW_ASYNC_UNSAFE"] = "true"
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=FLAGS)
        yield browser
        browser.close()


@pytest.fixture
def new_page(browser: Browser) -> Iterator[Callable[..., Page]]:
    """Opens a page in a browser context of its own (another person, another session)."""
    opened: list[Page] = []

    def open_page(**options) -> Page:
        context = browser.new_context(**{"viewport": WIDE, **options})
        context.add_init_script(LISTEN)
        page = context.new_page()
        page.complaints = []
        page.on("console", lambda message: page.complaints.append(message.text) if message.type == "error" else None)
        page.on("pageerror", lambda error: page.complaints.append(str(error)))
        opened.append(page)
        return page

    yield open_page
    complaints = [complaint for page in opened for complaint in page.complaints]
    for page in opened:
        page.context.close()
    assert not complaints, complaints


@pytest.fixture
def page_for(live_server, new_page) -> Callable[..., Page]:
    """Signs a user in through the form and returns the page."""

    def signed_in(user, password: str = PASSWORD, **options) -> Page:
        page = new_page(**options)
        page.goto(f"{live_server.url}/sign-in/")
        page.fill("input[name=username]", user.username)
        page.fill("input[name=password]", password)
        page.click("main button[type=submit]")
        page.wait_for_url(lambda url: "/sign-in/" not in url)
        return page

    return signed_in
