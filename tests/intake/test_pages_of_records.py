"""The page of an uploaded file opens for logs, surveys, core text, tops and tables on their side as for any other."""

from pathlib import Path

import pytest
from django.urls import reverse

from labdata.models import Role
from tests.factories import MembershipFactory, ProjectFactory
from tests.intake.landing import land
from tests.intake.test_real_records import CORE, REAL
from tests.intake.test_turned import TURNED

pytestmark = pytest.mark.django_db
FILES = [
    "las/6038187_v1.2.las",
    "surveys/P-135_deviation_survey.xlsx",
    "surveys/P-130_deviation_survey.csv",
    "tops/4900527774.tops",
    CORE,
]


@pytest.fixture
def visitor(client):
    member = MembershipFactory(role=Role.COORDINATOR)
    client.force_login(member.user)
    return client, member.project


def opened(visitor, content, name, **options):
    client, project = visitor
    upload = land(project, content, name, **options).upload
    where = {"slug": project.slug, "pk": upload.pk}
    for at in range(len(upload.answer["tables"])):
        assert client.get(reverse("upload_sheet", kwargs={**where, "table": at})).status_code in {200, 404}
    assert client.get(reverse("desk", kwargs=where)).status_code in {200, 302}
    return client.get(reverse("upload", kwargs={"slug": project.slug, "pk": upload.pk}))


@pytest.mark.parametrize("path", FILES)
def test_the_page_of_a_file_of_records_opens(visitor, path):
    assert opened(visitor, (REAL / path).read_bytes(), Path(path).name).status_code == 200


@pytest.mark.parametrize(
    "text", [TURNED, TURNED.replace("12.75", "abc"), TURNED.replace("wt%", "").replace("1.25,<0.05,3.1", "0.6,0.5,0.9")]
)
def test_the_page_of_a_table_on_its_side_opens(visitor, text):
    assert opened(visitor, text, "turned.csv", well="Quill 1").status_code == 200


def test_projects_are_told_apart(visitor):
    other = land(ProjectFactory(), TURNED, "turned.csv", well="Quill 1").upload
    client, project = visitor
    assert client.get(reverse("upload", kwargs={"slug": project.slug, "pk": other.pk})).status_code == 404
