"""The review page in a real browser: what is selected in one place is seen in all, and roles hold."""

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Page

from labdata.models import Role
from qc.models import Decision, FlagAnswer, ReviewSetState
from qc.review.services import accept_unflagged
from qc.review.standing import results_of, standing, verdict_counts
from tests.factories import PASSWORD, ProjectFactory
from tests.qc.review.wells import flag, person, rich_well, small_set

pytestmark = [pytest.mark.browser, pytest.mark.django_db(transaction=True)]
SCREEN = {"width": 1440, "height": 900}


def until(page: Page, expression: str, seconds: float = 8):
    """Poll, since the policy forbids the evaluation that waiting in the page would need."""
    for _ in range(int(seconds * 20)):
        value = page.evaluate(expression)
        if value:
            return value
        page.wait_for_timeout(50)
    raise AssertionError(f"never true: {expression}; said: {page.inner_text('[data-part=said]')}")


def open_review(page: Page, live_server, review_set) -> Page:
    page.goto(f"{live_server.url}/p/{review_set.project.slug}/review/{review_set.pk}/")
    until(page, "document.querySelector('[data-review]').dataset.ready")
    page.wait_for_timeout(100)
    return page


def painted(page: Page, surface: str, layer: str = "overlay") -> int:
    """How many pixels of a canvas carry ink."""
    return page.evaluate(
        """([selector, layer]) => {
          const canvas = document.querySelector(`${selector} .plot-${layer}`);
          const pixels = canvas.getContext('2d').getImageData(0, 0, canvas.width, canvas.height).data;
          let count = 0;
          for (let at = 3; at < pixels.length; at += 4) if (pixels[at] > 40) count += 1;
          return count;
        }""",
        [surface, layer],
    )


def around(page: Page, plot: int, rows: list[int]) -> list[tuple[float, float]]:
    """Corners of a path round some points of a cross-plot, in page pixels."""
    return page.evaluate(
        """([plot, rows]) => {
          const { points, surface } = window.reviewPage.crossplots[plot];
          const box = surface.box.getBoundingClientRect(), wanted = new Set(rows), xs = [], ys = [];
          for (let i = 0; i < points.count; i += 1) if (wanted.has(points.row[i])) { xs.push(points.x[i]); ys.push(points.y[i]); }
          const [l, r, t, b] = [Math.min(...xs) - 5, Math.max(...xs) + 5, Math.min(...ys) - 5, Math.max(...ys) + 5];
          return [[l, t], [r, t], [r, b], [l, b], [l, t]].map(([x, y]) => [box.left + x, box.top + y]);
        }""",
        [plot, rows],
    )


def draw(page: Page, path) -> None:
    page.mouse.move(*path[0])
    page.mouse.down()
    for x, y in path[1:]:
        page.mouse.move(x, y, steps=6)
    page.mouse.up()
    page.wait_for_timeout(80)


def selected(page: Page) -> list[int]:
    return page.evaluate("[...window.reviewPage.selection.rows()]")


@pytest.fixture
def quern(live_server):
    """A realistic well of 120 samples, its geochemist and its approver."""
    project = ProjectFactory(slug="quern", name="Quern Basin")
    review_set = rich_well(project)
    return review_set, person(project, Role.GEOCHEMIST, "maren"), person(project, Role.APPROVER, "ysolde")


def test_a_lasso_in_a_cross_plot_shows_everywhere_and_a_tmax_is_rejected_and_signed(quern, live_server, page_for):
    review_set, chemist, approver = quern
    page = open_review(page_for(chemist), live_server, review_set)
    assert painted(page, "[data-part=tracks]", "points") > 2000
    assert painted(page, "[data-part=tracks]") == 0
    odd = page.evaluate("window.reviewPage.model.data.flags.filter((f) => f.rule === 'tmax_range').map((f) => f.row)")[
        :1
    ]
    page.click("[data-tool][value=lasso]")
    assert page.get_attribute("[data-tool][value=lasso]", "aria-pressed") == "true"
    draw(page, around(page, 4, odd))
    assert set(odd) <= set(selected(page))
    assert painted(page, "[data-part=tracks]") > 100
    assert all(painted(page, f"[data-crossplot] >> nth={n}".split(" >> ")[0]) > 20 for n in (0, 4))
    page.select_option("#filters select[name=only]", "selected")
    assert page.locator(".twin tr[aria-selected=true]").count() == len(selected(page))

    reject_one_tmax(page, review_set)
    until(page, "document.querySelector('[data-part=counts]').textContent.includes('1 rejected')")
    [decision] = Decision.objects.all()
    assert (decision.result.analyte.code, decision.verdict, decision.reason, decision.text) == (
        "TMAX", "rejected", "low_signal", "no maximum",
    )  # fmt: skip
    finish(page, review_set)

    assert page.locator("form[data-post=sign]").count() == 0, "a geochemist has no signature form"
    sign(page_for(approver), live_server, review_set)


def reject_one_tmax(page: Page, review_set) -> None:
    """Click the Tmax cell of the first selected row, give a reason, reject."""
    labels = page.locator(".twin thead th").all_inner_texts()
    column = next(n for n, label in enumerate(labels) if label.startswith("Tmax"))
    page.locator(".twin tr[data-at] >> nth=0").locator("td").nth(column).click()
    page.check("#decision input[value=rejected]")
    page.select_option("#decision select[name=reason]", "low_signal")
    page.fill("#decision input[name=text]", "no maximum")
    assert page.inner_text("[data-apply]") == "Reject 1 result"
    page.click("[data-apply]")


def finish(page: Page, review_set) -> None:
    """Accept what carries no flag, dismiss the flags of what is left, accept the rest."""
    page.click("[data-accept-all]")
    until(page, "document.querySelector('[data-part=said]').textContent.includes('Accepted everything')")
    page.select_option("#filters select[name=only]", "flagged")
    page.click("[data-select-shown]")
    page.click("[data-all]")
    page.check("#decision input[value=accepted]")
    page.select_option("#decision select[name=reason]", "geology")
    left = page.evaluate("window.reviewPage.model.data.counts.undecided")
    assert left > 0
    page.evaluate("window.reviewPage.bar.choose(['TMAX', 'PI'])")
    page.click("[data-apply]")
    until(page, "window.reviewPage.model.data.counts.undecided === 0")
    assert verdict_counts(review_set)["undecided"] == 0


def sign(page: Page, live_server, review_set) -> None:
    open_review(page, live_server, review_set)
    assert page.locator("#decision").count() == 0, "an approver does not decide"
    page.click("#tab-sign")
    page.fill("#password", "not the password")
    page.click("form[data-post=sign] button")
    until(page, "document.querySelector('[data-part=said]').textContent.includes('not the password')")
    page.complaints.clear()  # the browser itself notes the refused request
    page.fill("#password", PASSWORD)
    page.click("form[data-post=sign] button")
    until(page, "document.querySelector('[data-part=state]').textContent === 'signed'")
    review_set.refresh_from_db()
    assert review_set.state == ReviewSetState.SIGNED
    assert "Signed by" in page.inner_text("#panel-sign")
    page.fill("#reopen-reason", "a duplicate came in")
    page.click("form[data-post=reopen] button")
    until(page, "document.querySelector('[data-part=state]').textContent === 'in review'")


def test_the_whole_review_by_keyboard(live_server, page_for):
    review_set = small_set(samples=4)
    chemist = person(review_set.project, Role.GEOCHEMIST)
    page = open_review(page_for(chemist), live_server, review_set)
    page.focus(".twin")
    keys = page.keyboard
    for key in ("ArrowDown", "ArrowRight", "ArrowRight", "ArrowRight", "ArrowRight", "ArrowRight"):
        keys.press(key)
    keys.press("Space")
    page.wait_for_timeout(60)
    assert selected(page) == [1]
    keys.press("r")
    assert page.evaluate("document.activeElement.name") == "reason"
    keys.type("signal")
    keys.press("Tab")
    keys.type("flat peak")
    keys.press("Enter")
    until(page, "document.querySelector('[data-part=said]').textContent === 'Decided.'")
    [decision] = Decision.objects.all()
    assert (decision.result.analyte.code, decision.verdict, decision.reason) == ("TMAX", "rejected", "low_signal")
    page.focus(".twin")
    keys.press("Control+a")
    keys.press("ArrowLeft")
    page.evaluate("window.reviewPage.bar.choose(null)")
    keys.press("a")
    assert page.evaluate("document.activeElement.dataset.apply !== undefined")
    keys.press("Enter")
    until(page, "window.reviewPage.model.data.counts.accepted === 16")
    page.click("button[data-undo]")
    until(page, "window.reviewPage.model.data.counts.rejected === 1")


def test_a_flag_shows_its_evidence_and_agreeing_rejects_what_it_says(live_server, page_for):
    review_set = small_set(samples=3)
    tmax = results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2")
    flag(tmax, message="Tmax 352 is too low", evidence={"computed": 352, "limit": 380, "alternatives": ["lost circulation fibre"],
         "inputs": [{"analyte": "TMAX", "text": "352", "cell": "F17", "sheet": "Data", "file": "q.xlsx"}]})  # fmt: skip
    page = open_review(page_for(person(review_set.project, Role.GEOCHEMIST)), live_server, review_set)
    page.click("details.rule summary")
    page.click("text=Evidence")
    until(page, "document.querySelector('#panel-flags').textContent.includes('F17')")
    assert "lost circulation fibre" in page.inner_text("#panel-flags")
    page.click("details.rule li >> text=Select it")
    page.wait_for_timeout(60)
    assert selected(page) == [1]
    page.click("details.rule li >> text=Agree…")
    page.fill(".answer [name=words]", "fibre in the cuttings")
    page.select_option(".answer [name=code]", "contamination")
    page.click(".answer [type=submit]")
    until(page, "window.reviewPage.model.data.counts.rejected === 1")
    assert FlagAnswer.objects.get().answer == "agreed"
    assert standing(results_of(review_set))[tmax.pk].reason == "contamination"


def test_two_people_at_once_do_not_overwrite_each_other(live_server, page_for):
    review_set = small_set(samples=2)
    mine = open_review(page_for(person(review_set.project, Role.GEOCHEMIST, "maren")), live_server, review_set)
    theirs = open_review(page_for(person(review_set.project, Role.GEOCHEMIST, "odalys")), live_server, review_set)
    theirs.evaluate("window.reviewPage.selection.apply([0])")
    theirs.wait_for_timeout(60)
    theirs.check("#decision input[value=held]")
    theirs.select_option("#decision select[name=reason]", "repeat_asked")
    theirs.click("[data-apply]")
    until(theirs, "window.reviewPage.model.data.counts.held === 4")
    mine.evaluate("window.reviewPage.selection.apply([0])")
    mine.wait_for_timeout(60)
    mine.click("[data-apply]")
    until(mine, "document.querySelector('[data-part=said]').textContent.includes('odalys held 4 results')")
    assert mine.evaluate("window.reviewPage.model.data.counts.held") == 4
    mine.complaints.clear()
    mine.click("[data-apply]")
    until(mine, "window.reviewPage.model.data.counts.accepted === 4")


def test_a_lost_connection_loses_nothing_typed(live_server, page_for):
    review_set = small_set(samples=2)
    page = open_review(page_for(person(review_set.project, Role.GEOCHEMIST)), live_server, review_set)
    page.evaluate("window.reviewPage.selection.apply([0, 1])")
    page.check("#decision input[value=held]")
    page.select_option("#decision select[name=reason]", "other")
    page.fill("#decision input[name=text]", "waiting for the duplicate")
    page.context.set_offline(True)
    page.click("[data-apply]")
    until(page, "document.querySelector('[data-part=said]').textContent.includes('does not answer')")
    assert page.input_value("#decision input[name=text]") == "waiting for the duplicate"
    assert selected(page) == [0, 1]
    page.complaints.clear()
    page.context.set_offline(False)
    page.click("[data-apply]")
    until(page, "window.reviewPage.model.data.counts.held === 8")


def test_narrowing_by_numbers_selects_the_same_as_the_lasso(quern, live_server, page_for):
    review_set, chemist, _ = quern
    page = open_review(page_for(chemist), live_server, review_set)
    page.select_option("#filters select[name=column]", "PI")
    page.fill("#filters input[name=low]", "0.3")
    page.click("#filters [type=submit]")
    page.click("[data-select-shown]")
    page.wait_for_timeout(60)
    values = page.evaluate(
        "[...window.reviewPage.selection.rows()].map((r) => window.reviewPage.model.byKey.get('PI').value[r])"
    )
    assert values and all(value >= 0.3 for value in values)
    assert painted(page, "[data-part=tracks]") > 100


@pytest.mark.parametrize("role", [Role.INTERPRETER, Role.COORDINATOR, Role.APPROVER])
def test_who_may_not_decide_finds_no_way_to(role, live_server, page_for):
    review_set = small_set(samples=1)
    page = open_review(page_for(person(review_set.project, role)), live_server, review_set)
    assert page.locator("#decision").count() == 0
    answer = page.evaluate(
        """async () => {
          const root = document.querySelector('[data-review]'), model = window.reviewPage.model;
          const answer = await fetch(root.dataset.decide, {method: 'POST',
            headers: {'X-CSRFToken': document.querySelector('[name=csrfmiddlewaretoken]').value},
            body: JSON.stringify({results: [model.columns[0].result[0]], verdict: 'accepted', version: model.data.set.version})});
          return [answer.status, (await answer.json()).error.code];
        }"""
    )
    assert answer == [403, "not_allowed"]
    assert not Decision.objects.exists()
    page.complaints.clear()


def test_no_accessibility_violations(live_server, page_for):
    review_set = small_set(samples=3)
    flag(results_of(review_set).get(analyte__code="TMAX", analysis__sample__label="A-2"), evidence={"computed": 352})
    page = page_for(person(review_set.project, Role.GEOCHEMIST))
    open_review(page, live_server, review_set)
    page.click("details.rule summary")
    page.click("details.rule li details.more summary")
    page.wait_for_timeout(200)
    assert_accessible(page)
    page.click("#tab-sign")
    page.set_viewport_size({"width": 1024, "height": 768})
    assert_accessible(page)
    address = f"{live_server.url}/p/{review_set.project.slug}/review/"
    for path in ("", f"{review_set.pk}/plain/"):
        page.goto(address + path)
        assert_accessible(page)


def assert_accessible(page: Page) -> None:
    found = Axe().run(page)
    assert found.violations_count == 0, found.generate_report()


def test_everything_stands_on_one_screen(quern, live_server, page_for):
    review_set, chemist, _ = quern
    page = open_review(page_for(chemist, viewport=SCREEN), live_server, review_set)
    assert page.evaluate("document.documentElement.scrollHeight <= window.innerHeight + 1")
    assert page.evaluate("document.documentElement.scrollWidth <= window.innerWidth")


def test_without_scripts_a_plain_table_decides(live_server, page_for):
    review_set = small_set(samples=1)
    page = page_for(person(review_set.project, Role.GEOCHEMIST), java_script_enabled=False)
    page.goto(f"{live_server.url}/p/{review_set.project.slug}/review/{review_set.pk}/")
    page.click("text=Plain table")
    page.check("input[name=result] >> nth=0")
    page.check("input[name=verdict][value=rejected]")
    page.click("main form button[type=submit]")
    assert "without a reason" in page.inner_text("main")
    page.check("input[name=result] >> nth=0")
    page.select_option("select[name=reason]", "depth")
    page.click("main form button[type=submit]")
    assert "1 rejected" in page.inner_text("main")
    assert verdict_counts(review_set)["rejected"] == 1


def test_the_work_list_says_what_waits_for_whom(live_server, page_for):
    review_set = small_set(samples=1)
    chemist, approver = person(review_set.project, Role.GEOCHEMIST), person(review_set.project, Role.APPROVER)
    page = page_for(approver)
    address = f"{live_server.url}/p/{review_set.project.slug}/review/"
    page.goto(address)
    assert "4 undecided" in page.inner_text("main")
    assert page.locator("tr.for-me").count() == 0
    accept_unflagged(user=chemist, review_set=review_set)
    page.goto(address)
    assert page.locator("tr.for-me").count() == 1
