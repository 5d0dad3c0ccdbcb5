"""Every page in a real browser: axe finds nothing, the policy holds, nothing sticks out; the small scripts work."""

import pytest
from axe_playwright_python.sync_playwright import Axe
from django.urls import reverse

from labdata.models import Job, JobState, Membership, Role
from tests.pages.test_access_walk import ELSEWHERE, PAGES, address
from tests.pages.world import world

pytestmark = [pytest.mark.browser, pytest.mark.django_db(transaction=True)]

NOT_PAGES = {
    "upload_progress",
    "job_progress",
    "file_download",
    "template_out",
    "release_data",
    "release_manifest",
    "logout",
}
SMALL = {"width": 1024, "height": 768}
STICKS_OUT = "() => document.documentElement.scrollWidth - document.documentElement.clientWidth"


@pytest.fixture
def made():
    return world()


@pytest.fixture
def everyone(made):
    """One person with every role, so that every part of a page is shown."""
    user = made.person("coordinator")
    for role in Role:
        Membership.objects.get_or_create(user=user, project=made.scene.project, role=role)
    return user


def violations(page) -> list[dict]:
    """What axe finds on the page as it stands."""
    return Axe().run(page, options={"resultTypes": ["violations"]}).response["violations"]


def addresses(made) -> dict[str, str]:
    """Every page that is loaded by a GET, by its URL name."""
    found = {name: address(name, page, made) for name, page in PAGES.items() if page.method == "get"}
    found |= {name: reverse(name) for name in ELSEWHERE - {"token_revoke", "job_cancel", "login"}}
    return {name: place for name, place in found.items() if name not in NOT_PAGES}


def test_axe_finds_nothing_on_any_page(made, everyone, page_for, live_server):
    page = page_for(everyone)
    faults = []
    for name, place in addresses(made).items():
        page.goto(live_server.url + place)
        page.evaluate("document.querySelectorAll('main details').forEach((one) => { one.open = true })")
        found = violations(page)
        faults += [f"{name}: {one['id']} {[node['target'] for node in one['nodes'][:3]]}" for one in found]
    assert not faults, "\n".join(faults)


def test_nothing_sticks_out_on_a_small_screen(made, everyone, page_for, live_server):
    page = page_for(everyone, viewport=SMALL)
    wide = []
    for name, place in addresses(made).items():
        page.goto(live_server.url + place)
        if page.evaluate(STICKS_OUT) > 0:
            wide.append(name)
    assert not wide


def test_signing_in_and_refusals_are_accessible_too(made, page_for, new_page, live_server):
    page = new_page()
    page.goto(live_server.url + reverse("login"))
    page.fill("input[name=username]", "nobody")
    page.fill("input[name=password]", "no")
    page.click("main button[type=submit]")
    assert not violations(page)
    page = page_for(made.person("interpreter"))
    for place, status in [("/nowhere/", 404), (reverse("members", args=[made.slug]), 403)]:
        assert page.goto(live_server.url + place).status == status
        assert not violations(page)
    page.complaints[:] = [one for one in page.complaints if "Failed to load resource" not in one]


def test_progress_is_polled_and_the_page_follows(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    page.goto(live_server.url + reverse("job", args=[made.slug, made.job.pk]))
    assert page.get_by_text("queued", exact=True).first.is_visible()
    Job.objects.filter(pk=made.job.pk).update(progress_note="reading sheet 2", progress_done=1, progress_total=4)
    page.get_by_text("reading sheet 2").wait_for()
    Job.objects.filter(pk=made.job.pk).update(
        state=JobState.CANCELLED, error_code="cancelled", error_message="Cancelled by the coordinator."
    )
    page.get_by_text("Cancelled by the coordinator.").wait_for()


def test_menus_open_by_key_and_close_by_escape(made, page_for, live_server):
    page = page_for(made.person("interpreter"))
    summary = page.locator("summary", has_text="Choose a project")
    summary.focus()
    page.keyboard.press("Enter")
    link = page.locator(".menu-list").get_by_role("link", name=made.scene.project.name)
    assert link.is_visible()
    page.keyboard.press("Escape")
    assert not link.is_visible()
    assert summary.evaluate("(one) => one === document.activeElement")


def test_files_are_dropped_on_the_zone(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    page.goto(live_server.url + reverse("uploads", args=[made.slug]))
    dropped = page.evaluate_handle(
        "() => { const held = new DataTransfer(); held.items.add(new File(['Well,TOC'], 'dropped.csv')); return held; }"
    )
    page.dispatch_event("[data-drop]", "drop", {"dataTransfer": dropped})
    assert page.evaluate("document.querySelector('input[type=file]').files[0].name") == "dropped.csv"
    page.get_by_role("button", name="Bring in").click()
    page.get_by_role("heading", name="dropped.csv").wait_for()


def test_taking_a_role_away_asks_first(made, page_for, live_server):
    page = page_for(made.person("administrator"))
    page.goto(live_server.url + reverse("members", args=[made.slug]))
    button = page.locator("button", has_text="geochemist of")
    page.once("dialog", lambda dialog: dialog.dismiss())
    button.click()
    assert Membership.objects.filter(project=made.scene.project, role=Role.GEOCHEMIST).exists()
    page.once("dialog", lambda dialog: dialog.accept())
    button.click()
    page.get_by_text("no longer has the role").wait_for()
    assert not Membership.objects.filter(project=made.scene.project, role=Role.GEOCHEMIST).exists()
