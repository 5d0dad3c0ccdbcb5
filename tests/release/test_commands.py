"""The commands release, pull and token answer as the contract says."""

import io
import json

import pytest
from django.core.management import CommandError, call_command

from labdata.models import ApiToken, Release
from tests.release.scene import release_of, signed_scene, small_scene


def run(*words):
    """(exit status, the one JSON object on stdout)."""
    out, status = io.StringIO(), 0
    try:
        call_command(*words, "--json", stdout=out, stderr=io.StringIO())
    except SystemExit as ended:
        status = ended.code
    except CommandError as wrong:
        return wrong.returncode, str(wrong)
    return status, json.loads(out.getvalue())


@pytest.mark.django_db(transaction=True)
def test_release_builds_the_next_release():
    scene = signed_scene()
    who = scene.person("approver").username
    status, told = run("release", "--project", scene.project.slug, "--title", "First look", "--user", who)
    made = Release.objects.get()
    assert (status, told["release"], told["number"], told["counts"]["usable"]) == (0, made.pk, 1, 28)
    assert (told["data_sha256"], told["unavailable"][0]["analyte"]) == (made.data_sha256, "HI")


@pytest.mark.django_db
@pytest.mark.parametrize(("role", "code"), [("approver", "nothing_signed"), ("geochemist", "not_allowed")])
def test_release_is_refused_with_a_reason(role, code):
    scene = small_scene()
    who = scene.person(role).username
    status, told = run("release", "--project", scene.project.slug, "--title", "Early", "--user", who)
    assert (status, told["error"]["code"]) == (1, code)


@pytest.mark.django_db
def test_pull_current_gives_every_result_with_its_verdict(tmp_path):
    scene = small_scene()
    out = tmp_path / "now.json"
    status, told = run("pull", "--project", scene.project.slug, "--current", "--format", "json", "--out", str(out))
    rows = json.loads(out.read_text())
    assert (status, told["bytes"]) == (0, out.stat().st_size)
    assert (len(rows), {row["verdict"] for row in rows}) == (30, {"undecided"})


@pytest.mark.django_db
@pytest.mark.parametrize(("words", "status"), [
    ([], 2), (["--release", "1", "--current", "--project", "x"], 2), (["--current"], 2), (["--project", "x"], 2),
    (["--project", "x", "--current", "--include", "rejected"], 2), (["--release", "99"], 1),
    (["--release", "99999999999999999999"], 1), (["--project", "nowhere", "--current"], 1),
    (["--release", "1", "--format", "pdf"], 1),
])  # fmt: skip
def test_pull_that_cannot_be(tmp_path, words, status):
    if "pdf" in words:
        with pytest.raises(CommandError, match="invalid choice"):
            call_command("pull", *words, "--out", str(tmp_path / "x"))
        return
    assert run("pull", *words, "--out", str(tmp_path / "x"))[0] == status
    assert not (tmp_path / "x").exists()


@pytest.mark.django_db
def test_pull_to_nowhere(tmp_path):
    release = release_of(signed_scene())
    status, told = run("pull", "--release", str(release.pk), "--out", str(tmp_path / "no" / "x"))
    assert (status, told["error"]["remedy"]) == (1, "Name another --out.")


@pytest.mark.django_db
def test_token_is_printed_once_and_kept_as_a_hash():
    scene = small_scene()
    who = scene.person("interpreter").username
    status, told = run("token", who, "--project", scene.project.slug, "--scope", "read", "--days", "3")
    token = ApiToken.objects.get()
    assert (status, token.scope, (token.expires_at - token.created_at).days in {2, 3}) == (0, "read", True)
    assert told["token"] not in token.key_sha256


@pytest.mark.django_db
@pytest.mark.parametrize("days", ["0", "-1", "100000"])
def test_token_for_a_strange_time(days):
    scene = small_scene()
    who = scene.person("interpreter").username
    status, told = run("token", who, "--project", scene.project.slug, "--scope", "read", "--days", days)
    assert (status, told["error"]["code"]) == (1, "invalid")
