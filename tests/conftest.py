"""What all tests share."""

from typing import Any

import pytest
from django.db import connections
from django.test import TransactionTestCase

from labdata import triggers
from tests.setup.services import leave_out, postgresql_url, rabbitmq_url, redis_url, say_left_out

__all__ = ["postgresql_url", "rabbitmq_url", "redis_url"]

_empty_tables = TransactionTestCase._fixture_teardown


def _empty_guarded_tables(case: TransactionTestCase) -> None:
    """Append-only tables refuse the emptying between cases; the triggers come back with post_migrate."""
    for connection in connections.all(initialized_only=True):
        triggers.remove(connection)
    _empty_tables(case)


TransactionTestCase._fixture_teardown = _empty_guarded_tables  # type: ignore[method-assign]


def pytest_collection_modifyitems(config: pytest.Config, items: list[pytest.Item]) -> None:
    leave_out(config, items)


def pytest_terminal_summary(terminalreporter: Any, config: pytest.Config) -> None:
    say_left_out(terminalreporter, config)


@pytest.fixture(autouse=True)
def _own_file_store(settings: Any, tmp_path: Any) -> None:
    """Files of a test go to its own folder."""
    settings.MEDIA_ROOT = tmp_path / "files"
    settings.STORAGES = {
        **settings.STORAGES,
        "default": {
            "BACKEND": "django.core.files.storage.FileSystemStorage",
            "OPTIONS": {"location": str(tmp_path / "files")},
        },
    }


@pytest.fixture(autouse=True)
def _quick_passwords(settings: Any) -> None:
    """Slow hashing protects real passwords; made-up people need none."""
    settings.PASSWORD_HASHERS = ["django.contrib.auth.hashers.MD5PasswordHasher"]
