"""The mapping desk in a real browser: a layout not seen before, from drop to stored results; by keyboard; without scripts."""

import pytest
from axe_playwright_python.sync_playwright import Axe
from django.urls import reverse

from labdata.models import Job, JobState, RememberedLayout, Result, Upload
from tests.browser.test_pages import SMALL, STICKS_OUT
from tests.intake.landing import carry, workbook
from tests.pages.world import world

pytestmark = [pytest.mark.browser, pytest.mark.django_db(transaction=True)]


@pytest.fixture
def made():
    return world()


def odd_workbook() -> bytes:
    """Two sheets in words of the laboratory's own, with a title block and a header of two rows."""

    def fill(book):
        sheet = book.active
        sheet.title = "Run 7"
        for row in (
            ["Basin survey, rock kerogen run"], ["Analysed by", "North Lab"], [],
            ["Place", "Tube", "Level", "Kero", "Flame", "Flame", "Oven"], ["", "", "below table", "carbon", "peak A", "peak B", "top"],
            *([f"Quill {1 + at // 4}", f"T-{at}", 2000 + 5 * at, 1.5 + at / 10, 0.2, 4 + at, 430 + at] for at in range(8)),
        ):  # fmt: skip
            sheet.append(row)
        sheet["I4"] = "initials"
        for row in range(6, 14):
            sheet.cell(row, 9, "ab")
        book.create_sheet("Diary").append(["The oven was cleaned on Monday."])

    return workbook(fill)


def settled(upload: Upload) -> Upload:
    """The worker's part."""
    carry(upload)
    Job.objects.filter(pk=upload.job_id).update(state=JobState.SUCCEEDED)
    upload.refresh_from_db()
    return upload


def drop(page, live_server, made, content: bytes, name: str) -> Upload:
    """Drop the file on the page, tick the boxes, send it, and have it read."""
    page.goto(live_server.url + reverse("uploads", args=[made.slug]))
    page.set_input_files("input[type=file]", {"name": name, "mimeType": "application/octet-stream", "buffer": content})
    page.get_by_label("Make wells that are not known yet").check()
    page.get_by_label("Look before storing").check()
    page.get_by_role("button", name="Bring in").click()
    page.get_by_role("heading", name=name).wait_for()
    upload = settled(Upload.objects.latest("pk"))
    page.wait_for_url("**/desk/")
    return upload


def verdict(page, text: str) -> None:
    page.locator(".verdict", has_text=text).wait_for()


def choose(page, column: str, field: str) -> None:
    """Choose a field and wait until its outcome stands on the page."""
    with page.expect_response("**/desk/look/"):
        page.get_by_label(f"Column {column} is read as").select_option(field)
    page.locator(f"select.is-set[id$='-{ord(column) - 64}']").first.wait_for()


def test_a_layout_not_seen_before_from_drop_to_stored_results(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    upload = drop(page, live_server, made, odd_workbook(), "run 7.xlsx")
    verdict(page, "refused")
    page.get_by_label("Header rows of Run 7").fill("4-5")
    page.get_by_label("Header rows of Run 7").press("Tab")
    page.get_by_label("Column B is read as").wait_for()
    fields = {"A": "WELL", "B": "SAMPLE", "C": "TOP", "D": "TOC", "E": "S1", "F": "S2", "G": "TMAX", "I": "leave out"}
    for column, field in fields.items():
        choose(page, column, field)
    with page.expect_response("**/desk/look/"):
        page.get_by_label("Unit of column C").select_option("m")
    verdict(page, "stored, with notes")
    assert page.locator(".desk-outcome .figures li", has_text="results").first.inner_text().split()[0] == "32"
    assert page.locator("tr.read-as td", has_text="TOC wt%").count() == 1
    assert not Result.objects.filter(analysis__report__source_file=upload.source_file).exists()
    page.get_by_role("button", name="Store it").click()
    page.get_by_text("read again and stored").wait_for()
    upload.refresh_from_db()
    settled(upload)
    page.get_by_role("heading", name="What was stored").wait_for()
    stored = Result.objects.filter(analysis__report__source_file=upload.source_file)
    assert stored.count() == 32
    assert stored.get(analysis__sample__label="T-3", analyte__code="TOC").value == pytest.approx(1.8)
    assert RememberedLayout.objects.get().laboratory_name == "North Lab"


def test_the_next_file_of_the_layout_needs_no_correction(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    content = b"Well,Probe,Lvl,Kero-C\nQuill 1,A,2000,1.5\nQuill 1,B,2001,1.6\n"
    upload = drop(page, live_server, made, content, "one.csv")
    page.get_by_label("Header rows").fill("1")
    page.get_by_label("Header rows").press("Tab")
    page.get_by_label("Column C is read as").wait_for()
    for column, field in {"B": "SAMPLE", "C": "TOP", "D": "TOC"}.items():
        choose(page, column, field)
    for column, unit in {"C": "m", "D": "wt%"}.items():
        with page.expect_response("**/desk/look/"):
            page.get_by_label(f"Unit of column {column}").select_option(unit)
    verdict(page, "stored whole")
    page.get_by_role("button", name="Store it").click()
    page.get_by_text("read again and stored").wait_for()
    upload.refresh_from_db()
    settled(upload)
    drop(page, live_server, made, content.replace(b"1.5", b"1.7").replace(b"A,2000", b"C,2010"), "two.csv")
    verdict(page, "stored, with notes")
    assert page.locator(".mapping", has_text="as corrected by").count() == 1


def test_the_desk_by_keyboard_and_its_jumps(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    content = b"Well,Depth (m),TOC (wt%),Junk\nQuill 1,2000,1.5,x\nQuill 1,2001,bad,y\n"
    drop(page, live_server, made, content, "keys.csv")
    focused = "document.activeElement.id"
    page.locator("#grid-box").focus()
    page.keyboard.press("ArrowDown")
    assert page.evaluate(focused) == "cell-A1"
    for key in ("ArrowRight", "ArrowRight", "ArrowDown", "ArrowUp"):
        page.keyboard.press(key)
    assert page.evaluate(focused) == "cell-C1"
    page.keyboard.press("Enter")
    assert page.evaluate(focused) == "field-0-3"
    assert page.locator("td.is-shown").get_attribute("id") == "cell-C1"
    with page.expect_response("**/desk/look/"):
        page.keyboard.press("m")  # mineral carbon, the next of that letter
    page.locator("#field-0-3.is-set").wait_for()
    assert page.evaluate(focused) == "field-0-3"  # still there after the desk came anew
    with page.expect_response("**/desk/look/"):
        page.locator("#field-0-3").select_option("TOC")
    page.locator(".finding-list a", has_text="C3").focus()
    page.keyboard.press("Enter")
    assert page.evaluate(focused) == "cell-C3"
    with page.expect_response("**/desk/look/"):
        page.get_by_label("leave C3 out").check()
    verdict(page, "stored, with notes")


def test_the_desk_without_scripts(made, page_for, live_server):
    scripted = page_for(made.person("coordinator"))
    upload = drop(scripted, live_server, made, odd_workbook(), "run 7.xlsx")
    page = page_for(made.person("coordinator"), java_script_enabled=False)
    page.goto(live_server.url + reverse("desk", args=[made.slug, upload.pk]))
    page.get_by_role("button", name="Take 4-5").click()
    assert page.get_by_label("Header rows of Run 7").input_value() == "4-5"
    for column, field in {"A": "WELL", "B": "SAMPLE", "D": "TOC"}.items():
        page.get_by_label(f"Column {column} is read as").select_option(field)
    page.get_by_role("button", name="See the outcome").click()
    assert page.get_by_label("Column D is read as").input_value() == "TOC"
    page.get_by_role("button", name="Diary").click()
    assert page.get_by_text("The oven was cleaned").is_visible()
    assert page.get_by_label("Column D is read as").input_value() == "TOC"
    page.get_by_role("button", name="Withdraw the file").click()
    assert page.get_by_text("nothing of it was stored").is_visible()


def test_the_desk_is_accessible_and_fits_both_screens(made, page_for, live_server):
    page = page_for(made.person("coordinator"))
    upload = drop(page, live_server, made, odd_workbook(), "run 7.xlsx")
    page.get_by_label("Header rows of Run 7").fill("4-5")
    page.get_by_label("Header rows of Run 7").press("Tab")
    page.get_by_label("Column B is read as").wait_for()
    choose(page, "D", "TOC")
    for size in ({"width": 1440, "height": 900}, SMALL):
        page.set_viewport_size(size)
        found = Axe().run(page, options={"resultTypes": ["violations"]}).response["violations"]
        assert not found, [(one["id"], [node["target"] for node in one["nodes"][:3]]) for one in found]
        assert page.evaluate(STICKS_OUT) <= 0
    question = drop(page, live_server, made, b"Depth (m),TOC\n5,0.5\n6,0.7\n", "asks.csv")
    assert question.outcome == "waiting"
    assert page.locator("#questions fieldset").count() == 2
    assert not Axe().run(page, options={"resultTypes": ["violations"]}).response["violations"]
    page.goto(live_server.url + reverse("desk", args=[made.slug, upload.pk]))
