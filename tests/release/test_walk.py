"""A release made of files that came in through intake, and what a later report version does to the next one."""

import pytest

from labdata.intake.services import receive
from labdata.jobs import run_all_here
from labdata.models import Upload
from labdata.release.changes import changes
from labdata.release.services import rebuild
from qc.models import ReviewSet
from tests.release.scene import bare_scene, release_of

HEAD = "Report No: R-77\n\nWell,Sample,Top (m),Base (m),TOC (wt%),S1 (mg/g),S2 (mg/g),Tmax (degC)\n"
ROWS = "Quill 1,A1,2000,2005,2.1,0.5,5.2,431\nQuill 1,A2,2010,2015,<0.05,0.1,{s2},436\n"


def bring_in(scene, name, text):
    receive(
        project=scene.project, name=name, content=(HEAD + text).encode(), user=scene.person("coordinator"), lab="Lab",
        create_wells=True, answers={"version": "amended version"},
    )  # fmt: skip
    run_all_here(scene.project)
    upload = Upload.objects.order_by("-pk").first()
    assert upload.outcome.startswith("imported"), upload.answer
    return upload


def decide_and_sign(scene):
    held = ReviewSet.objects.get(project=scene.project)
    scene.accept(held)
    scene.sign(held)


@pytest.mark.django_db(transaction=True)
def test_a_corrected_value_is_a_change_and_the_old_release_stands():
    scene = bare_scene()
    bring_in(scene, "R-77.csv", ROWS.format(s2="0.15"))
    decide_and_sign(scene)
    first = release_of(scene)
    bring_in(scene, "R-77.csv", ROWS.format(s2="0.25"))
    decide_and_sign(scene)
    second = release_of(scene, "Corrected")
    told = changes(second, first)
    assert (told["added"], told["withdrawn"]) == ([], [])
    [changed] = told["changed"]
    assert (changed["before"]["value"], changed["after"]["value"]) == (0.15, 0.25)
    assert changed["after"]["report_version"] == 2
    assert rebuild(first) == first.data_sha256
    assert rebuild(second) == second.data_sha256
