"""Making accounts, and the first one of all."""

import pytest
from django.contrib.auth.models import User

from labdata import accounts
from labdata.errors import Conflict, InvalidInput
from labdata.models import AuditEntry

pytestmark = [pytest.mark.both, pytest.mark.django_db]


def test_the_first_administrator_is_made_once(monkeypatch):
    monkeypatch.delenv("KEROGATE_ADMIN_PASSWORD", raising=False)
    name, password = accounts.first_administrator()
    user = User.objects.get()
    assert (user.username, user.is_superuser, user.check_password(password)) == (name, True, True)
    assert len(password) >= 16
    assert accounts.first_administrator() is None
    assert AuditEntry.objects.get().action == "account.created"


def test_the_password_may_come_from_outside(monkeypatch):
    monkeypatch.setenv("KEROGATE_ADMIN_PASSWORD", "heather and granite")
    assert accounts.first_administrator() == ("administrator", "heather and granite")


@pytest.mark.parametrize(
    ("name", "password"), [("ada", "short"), ("ada", "password1234"), ("a b/c", "heather granite")]
)
def test_poor_names_and_passwords_are_refused(name, password):
    with pytest.raises(InvalidInput):
        accounts.create_account(name, password)
    assert not User.objects.exists()


def test_a_name_is_taken_whatever_its_case():
    accounts.create_account("ada", "heather and granite")
    with pytest.raises(Conflict):
        accounts.create_account("Ada", "heather and granite")
