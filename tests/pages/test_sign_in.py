"""Signing in, and the throttle in front of it."""

from datetime import timedelta

import pytest
from django.urls import reverse
from django.utils import timezone

from labdata.models import LoginFailure
from tests.factories import PASSWORD, UserFactory

pytestmark = pytest.mark.django_db
LOGIN = "/sign-in/"


def sign_in(client, account, password, address="10.0.0.1"):
    return client.post(LOGIN, {"username": account, "password": password}, REMOTE_ADDR=address)


def test_the_right_password_leads_to_the_work_list(client):
    user = UserFactory()
    answer = sign_in(client, user.username, PASSWORD)
    assert (answer.status_code, answer["Location"]) == (302, reverse("home"))


def test_a_wrong_password_and_an_unknown_account_sound_the_same(client):
    known = sign_in(client, UserFactory().username, "no").context["form"].non_field_errors()
    unknown = sign_in(client, "nobody", "no").context["form"].non_field_errors()
    assert known == unknown == ["Account and password do not match. Both mind capital letters."]


def test_five_failures_lock_the_account_for_the_address_only(client):
    user = UserFactory()
    for _ in range(5):
        sign_in(client, user.username, "no")
    locked = sign_in(client, user.username.upper(), PASSWORD)
    assert locked.status_code == 200
    assert "Try again in 15 minutes" in locked.context["form"].non_field_errors()[0]
    assert sign_in(client, user.username, PASSWORD, address="10.0.0.2").status_code == 302


def test_the_lock_ends_after_fifteen_minutes(client):
    user = UserFactory()
    for _ in range(5):
        sign_in(client, user.username, "no")
    LoginFailure.objects.update(at=timezone.now() - timedelta(minutes=16))
    assert sign_in(client, user.username, PASSWORD).status_code == 302


def test_a_success_starts_the_count_anew(client):
    user = UserFactory()
    for _ in range(4):
        sign_in(client, user.username, "no")
    sign_in(client, user.username, PASSWORD)
    for _ in range(4):
        sign_in(client, user.username, "no")
    assert sign_in(client, user.username, PASSWORD).status_code == 302


def test_a_closed_account_does_not_come_in(client):
    user = UserFactory(is_active=False)
    assert sign_in(client, user.username, PASSWORD).status_code == 200


def test_after_signing_in_one_is_where_one_wanted_to_be(client):
    user = UserFactory()
    asked = client.get(reverse("tokens"))["Location"]
    answer = client.post(asked, {"username": user.username, "password": PASSWORD, "next": reverse("tokens")})
    assert answer["Location"] == reverse("tokens")
    elsewhere = client.post(LOGIN, {"username": user.username, "password": PASSWORD, "next": "https://elsewhere.test/"})
    assert elsewhere["Location"] == reverse("home")


def test_the_password_is_changed_only_with_the_old_one(client):
    user = UserFactory()
    client.force_login(user)
    new = "another long enough phrase"
    address = reverse("password_change")
    refused = client.post(address, {"old_password": "no", "new_password1": new, "new_password2": new})
    assert refused.status_code == 200
    assert (
        client.post(address, {"old_password": PASSWORD, "new_password1": new, "new_password2": new}).status_code == 302
    )
    user.refresh_from_db()
    assert user.check_password(new)
