"""Report figures: the marks are all there, in the shapes of the page, and the same data give the same bytes."""

import io
import re

import numpy as np
import pytest
from django.urls import reverse
from matplotlib import image

from labdata.errors import InvalidInput
from labdata.models import Role
from qc.review import figures
from qc.review.data import review_data
from qc.review.drawings import drawing, points
from qc.review.drawings.marks import mark_of
from qc.review.services import Choice, decide, sign_off
from qc.review.standing import results_of
from tests.factories import PASSWORD, ProjectFactory, UserFactory
from tests.qc.review.wells import people, person, qc_run, rich_well, small_set

pytestmark = pytest.mark.django_db


@pytest.fixture
def well():
    """A well of forty samples, some S1 rejected, with values below their limits; and its geochemist."""
    review_set = rich_well(ProjectFactory(), samples=40)
    chemist = person(review_set.project, Role.GEOCHEMIST)
    s1 = results_of(review_set).filter(analyte__code="S1", analysis__sample__top_md_m__gt=2600)
    decide(user=chemist, review_set=review_set, choices=[Choice(one.pk, "rejected", "contamination") for one in s1])
    return review_set, chemist


def groups(svg: bytes) -> dict[str, int]:
    """Marks per named group of an SVG."""
    found: dict[str, int] = {}
    for name, body in re.findall(r'<g id="((?:mark|arrow)-[^"]+)">(.*?)\n   </g>', svg.decode(), re.DOTALL):
        found[name] = found.get(name, 0) + body.count("<use ")
    return found


def svg(figure) -> bytes:
    return drawing.as_bytes(figure, "svg")


def test_a_track_holds_a_mark_for_every_value_and_an_arrow_for_every_limit(well):
    review_set, chemist = well
    found = groups(svg(drawing.tracks(review_set, chemist, ["S2"])))
    s2 = results_of(review_set).filter(analyte__code="S2")
    assert sum(count for name, count in found.items() if name.startswith("mark")) == s2.count()
    assert found["arrow-undecided-180"] == found["mark-undecided-180"] == s2.filter(qualifier="<").count() > 0


def test_rejected_values_are_drawn_apart_and_far_ones_stand_at_the_edge(well):
    review_set, chemist = well
    found = groups(svg(drawing.tracks(review_set, chemist, ["S1"])))
    rejected = results_of(review_set).filter(analyte__code="S1", decisions__verdict="rejected").count()
    assert sum(count for name, count in found.items() if name.startswith("mark-rejected")) == rejected > 5
    assert found["arrow-rejected-0"] > 0


def test_all_tracks_stand_on_one_page_with_units_and_status(well):
    review_set, chemist = well
    text = svg(drawing.tracks(review_set, chemist)).decode()
    for part in ("Ambry Fold 2: depth tracks", "mg/g", "°C", "depth [m MD]", "Quern Formation", "rejected", "NOT SIGNED",
                 "rule set standard version 1", "casing shoe", "a limit, or beyond the axis"):  # fmt: skip
        assert part in text, part
    columns = review_data(review_set, chemist)["columns"][: figures.TRACKS_AT_FIRST]
    values = sum(value is not None for column in columns for value in column["value"])
    assert sum(count for name, count in groups(text.encode()).items() if name.startswith("mark")) == values


def test_a_cross_plot_shows_the_graver_state_and_the_fit(well):
    review_set, chemist = well
    text = svg(drawing.pair(review_set, chemist, "TOC", "S2"))
    data = points.columns(review_data(review_set, chemist))
    both = sum(x is not None and y is not None for x, y in
               zip(data["TOC"].sent["value"], data["S2"].sent["value"], strict=True))  # fmt: skip
    assert sum(count for name, count in groups(text).items() if name.startswith("mark")) == both
    assert b"S2 = 4.31 TOC" in text and b'<g id="fit">' in text and b"TOC [wt%]" in text
    s1 = groups(svg(drawing.pair(review_set, chemist, "TOC", "S1")))
    assert any(name.startswith("mark-rejected") for name in s1)


@pytest.mark.parametrize("file_format", drawing.FORMATS)
def test_the_same_data_give_the_same_bytes(file_format, well):
    review_set, chemist = well
    once, again = (drawing.as_bytes(drawing.tracks(review_set, chemist, ["TOC", "S2"]), file_format) for _ in range(2))
    assert once == again
    assert not re.search(rb"CreationDate|<dc:date>", once)


def test_a_picture_is_not_blank(well):
    review_set, chemist = well
    content = drawing.as_bytes(drawing.pair(review_set, chemist, "TMAX", "HI"), "png")
    pixels = image.imread(io.BytesIO(content), format="png")[..., :3]
    assert (pixels.min(axis=2) < 0.9).mean() > 0.01
    wanted = np.array([int(figures.MARKERS["undecided"].colour[at : at + 2], 16) / 255 for at in (1, 3, 5)])
    assert (np.abs(pixels - wanted).max(axis=2) < 0.02).sum() > 100


def test_every_state_looks_like_itself():

    looks = [mark_of(state) for state in figures.STATES]
    signs = [(look["marker"], look["fillstyle"], look["markerfacecolor"] == "white") for look in looks]
    assert len(set(signs)) == len(figures.STATES)
    assert [look["markeredgecolor"] for look in looks] == [figures.MARKERS[state].colour for state in figures.STATES]
    assert min(looks, key=lambda look: look["markeredgewidth"]) == mark_of("rejected")


def test_a_signed_set_says_by_whom():
    review_set = small_set(samples=2)
    qc_run(review_set.well)
    chemist, approver = people(review_set.project)
    ids = results_of(review_set).values_list("pk", flat=True)
    decide(user=chemist, review_set=review_set, choices=[Choice(pk, "accepted") for pk in ids])
    made = sign_off(user=approver, review_set=review_set, password=PASSWORD, meaning="reviewed")
    text = svg(drawing.tracks(review_set, approver)).decode()
    assert f"signed by {made.signer_name}" in " ".join(text.split()) and made.content_sha256[:12] in text
    assert "NOT SIGNED" not in text


def test_what_cannot_be_drawn_is_refused_by_name(well):
    review_set, chemist = well
    with pytest.raises(InvalidInput, match="has no values of «ZZ»"):
        drawing.tracks(review_set, chemist, ["ZZ"])
    with pytest.raises(InvalidInput, match="13 tracks do not fit"):
        drawing.tracks(review_set, chemist, ["TOC"] * 13)
    with pytest.raises(InvalidInput, match="no format"):
        drawing.as_bytes(drawing.pair(review_set, chemist, "TOC", "S1"), "gif")


def test_members_get_the_file_and_nobody_else(client):
    review_set = small_set(samples=1)
    address = reverse("review_drawing", args=[review_set.project.slug, review_set.pk])
    assert client.get(address).status_code == 302
    client.force_login(UserFactory())
    assert client.get(address).status_code == 404
    for role in Role:
        client.force_login(person(review_set.project, role))
        assert client.get(address, {"plot": "pair", "x": "TOC", "y": "S2", "format": "svg"}).status_code == 200
    answer = client.get(address, {"plot": "tracks", "column": ["TOC", "S1"], "format": "pdf"})
    assert answer["Content-Type"] == "application/pdf" and answer.content.startswith(b"%PDF-")
    assert re.search(r"set-1-TOC-S1\.pdf", answer["Content-Disposition"])
    for bad in ({"plot": "map"}, {"format": "gif"}, {"column": "ZZ"}, {"plot": "pair"}):
        assert client.get(address, bad).status_code == 400
