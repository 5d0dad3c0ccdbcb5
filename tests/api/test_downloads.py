"""Data over real HTTP: whole, in ranges and with pandas alone; the command pull gives the same bytes."""

import hashlib
import io
import json
from urllib.error import HTTPError
from urllib.request import Request, urlopen

import pandas as pd
import pyarrow.parquet as pq
import pytest
from django.core.management import call_command

from labdata.release.export import FORMATS
from labdata.tokens import issue_token
from tests.api.conftest import client_for
from tests.release.scene import release_of, signed_scene


@pytest.fixture
def release(signed):
    return release_of(signed)


def data_url(release, **query):
    asked = "&".join(f"{name}={value}" for name, value in query.items())
    return f"/api/v1/releases/{release.pk}/data?{asked}"


def body(answer):
    return b"".join(answer.streaming_content) if answer.streaming else answer.content


@pytest.mark.django_db
@pytest.mark.parametrize("format_name", list(FORMATS))
@pytest.mark.parametrize("shape", ["long", "wide"])
def test_the_command_gives_the_bytes_of_the_api(signed, release, tmp_path, format_name, shape):
    answer = client_for(signed, "interpreter", "read").get(data_url(release, format=format_name, shape=shape))
    out = tmp_path / "data"
    told = io.StringIO()
    call_command(
        "pull", "--release", str(release.pk), "--format", format_name, "--shape", shape, "--out", str(out), "--json",
        stdout=told,
    )  # fmt: skip
    content = body(answer)
    assert out.read_bytes() == content
    assert json.loads(told.getvalue())["sha256"] == hashlib.sha256(content).hexdigest()
    extension = "zip" if format_name == "las" else format_name
    name = f"{signed.project.slug}-release-1-{shape}.{extension}"
    assert answer["Content-Disposition"] == f'attachment; filename="{name}"'
    assert int(answer["Content-Length"]) == len(content)


@pytest.mark.django_db
def test_parquet_long_is_what_comes_unless_told(signed, release):
    content = body(client_for(signed, "interpreter").get(f"/api/v1/releases/{release.pk}/data"))
    assert pq.read_table(io.BytesIO(content)).num_rows == 28


@pytest.mark.django_db
@pytest.mark.parametrize(("asked", "first", "last"), [
    ("bytes=0-99", 0, 100), ("bytes=100-", 100, None), ("bytes=-50", -50, None), ("bytes=10-9999999", 10, None),
])  # fmt: skip
def test_a_range_is_a_part(signed, release, asked, first, last):
    client = client_for(signed, "interpreter")
    whole = body(client.get(data_url(release)))
    answer = client.get(data_url(release), HTTP_RANGE=asked)
    part = body(answer)
    assert (answer.status_code, part) == (206, whole[first:last])
    start = whole.index(part)
    assert answer["Content-Range"] == f"bytes {start}-{start + len(part) - 1}/{len(whole)}"


@pytest.mark.django_db
@pytest.mark.parametrize("asked", ["bytes=9999999-", "bytes=20-10", "bytes=-0"])
def test_a_range_outside_is_refused(signed, release, asked):
    answer = client_for(signed, "interpreter").get(data_url(release), HTTP_RANGE=asked)
    assert (answer.status_code, answer.json()["code"]) == (416, "range_not_satisfiable")


@pytest.mark.django_db
@pytest.mark.parametrize("asked", ["bytes=0-1,5-6", "lines=0-1", "bytes=-", "bytes=a-b"])
def test_a_range_that_is_not_understood_gets_the_whole(signed, release, asked):
    assert client_for(signed, "interpreter").get(data_url(release), HTTP_RANGE=asked).status_code == 200


@pytest.mark.django_db
def test_what_the_client_has_is_not_sent_again(signed, release):
    client = client_for(signed, "interpreter")
    tag = client.get(data_url(release))["ETag"]
    again = client.get(data_url(release), HTTP_IF_NONE_MATCH=tag)
    assert (again.status_code, again.content) == (304, b"")
    other = client.get(data_url(release, format="csv"), HTTP_IF_NONE_MATCH=tag)
    assert other.status_code == 200
    assert client.get(data_url(release), HTTP_RANGE="bytes=0-9", HTTP_IF_RANGE='"old"').status_code == 200


@pytest.mark.django_db
def test_head_tells_the_size_and_sends_nothing(signed, release):
    client = client_for(signed, "interpreter")
    whole = body(client.get(data_url(release)))
    answer = client.head(data_url(release))
    assert (int(answer["Content-Length"]), body(answer)) == (len(whole), b"")


@pytest.mark.django_db
def test_the_manifest_is_the_bytes_of_its_checksum(signed, release):
    answer = client_for(signed, "interpreter").get(f"/api/v1/releases/{release.pk}/manifest")
    assert hashlib.sha256(answer.content).hexdigest() == release.manifest_sha256
    assert answer.json()["data"]["sha256"] == release.data_sha256


@pytest.mark.django_db
def test_rejected_values_come_when_asked_for(signed, release):
    content = body(client_for(signed, "interpreter").get(data_url(release, format="json", include="rejected")))
    assert [row["analyte"] for row in json.loads(content) if row["verdict"] == "rejected"] == ["S2"]


@pytest.fixture
def served(transactional_db, live_server):
    scene = signed_scene()
    release = release_of(scene)
    key = issue_token(scene.person("interpreter"), scene.project, "read")
    return f"{live_server.url}{data_url(release, format='parquet', shape='wide')}", key


def test_pandas_reads_a_release_with_nothing_else(served):
    url, key = served
    frame = pd.read_parquet(url, storage_options={"Authorization": f"Token {key}"})
    assert len(frame) == 12
    assert frame["TOC"].dropna().tolist() == [2.125] * 6


def test_pandas_without_a_token_is_turned_away(served):
    with pytest.raises(HTTPError, match="401"):
        pd.read_parquet(served[0])


def test_a_broken_download_is_taken_up_where_it_ended(served):
    url, key = served
    headers = {"Authorization": f"Token {key}"}
    with urlopen(Request(url, headers=headers)) as answer:
        whole, etag = answer.read(), answer.headers["ETag"]
    with urlopen(Request(url, headers={**headers, "Range": "bytes=1000-", "If-Range": etag})) as answer:
        assert answer.status == 206
        assert answer.headers["Content-Range"] == f"bytes 1000-{len(whole) - 1}/{len(whole)}"
        assert whole[:1000] + answer.read() == whole
