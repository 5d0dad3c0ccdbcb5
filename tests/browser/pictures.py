"""Take the pictures of README.md from a running demonstration.

``python -m tests.browser.pictures http://127.0.0.1:8000 PASSWORD labdata/demo/pictures`` with the demo's password.
"""

import sys
from pathlib import Path

from playwright.sync_api import Browser, Page, sync_playwright

from tests.browser.chromium import CHROMIUM, FLAGS, WIDE


def signed_in(browser: Browser, address: str, name: str, password: str) -> Page:
    page = browser.new_context(viewport=WIDE).new_page()
    page.goto(f"{address}/sign-in/")
    page.fill("input[name=username]", name)
    page.fill("input[name=password]", password)
    page.click("main button[type=submit]")
    page.wait_for_load_state("networkidle")
    return page


def first_link(page: Page, address: str, path: str, contains: str) -> str:
    """Address of the first link on ``path`` whose target contains ``contains``."""
    page.goto(address + path)
    return address + (page.locator(f"main a[href*='{contains}']").first.get_attribute("href") or "")


def take(address: str, password: str, folder: Path) -> None:
    """Write one PNG a page into ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=FLAGS)
        page = signed_in(browser, address, "geochemist", password)
        upload = first_link(page, address, "/p/demo/uploads/", "/uploads/")
        pages = {
            "work": f"{address}/",
            "project": f"{address}/p/demo/",
            "wells": f"{address}/p/demo/wells/",
            "well": first_link(page, address, "/p/demo/wells/", "/wells/"),
            "uploads": f"{address}/p/demo/uploads/",
            "upload": upload,
            "qc": f"{address}/p/demo/qc/",
            "review-sets": f"{address}/p/demo/review/",
            "review": first_link(page, address, "/p/demo/review/", "/review/"),
            "rules": f"{address}/p/demo/rules/",
            "releases": f"{address}/p/demo/releases/",
            "release": first_link(page, address, "/p/demo/releases/", "/releases/"),
            "audit": f"{address}/p/demo/audit/",
        }
        for name, target in pages.items():
            page.goto(target)
            page.wait_for_load_state("networkidle")
            page.wait_for_timeout(500)
            page.screenshot(path=folder / f"{name}.png")
        browser.close()


if __name__ == "__main__":
    take(sys.argv[1].rstrip("/"), sys.argv[2], Path(sys.argv[3]))
