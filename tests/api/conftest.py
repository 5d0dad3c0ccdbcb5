"""What the API tests share: a project under review with one person a role, and clients with tokens."""

import pytest
from rest_framework.test import APIClient

from labdata.models import Project
from labdata.tokens import issue_token
from tests.factories import PASSWORD
from tests.release.scene import Scene, signed_scene, small_scene


@pytest.fixture
def scene(db) -> Scene:
    return small_scene()


@pytest.fixture
def signed(db) -> Scene:
    return signed_scene()


def client_of(user, project: Project, scope: str = "write") -> APIClient:
    """A client with a token of the user."""
    client = APIClient()
    client.credentials(HTTP_AUTHORIZATION=f"Token {issue_token(user, project, scope)}")
    return client


def client_for(scene: Scene, role: str, scope: str = "write") -> APIClient:
    return client_of(scene.person(role), scene.project, scope)


def signed_in(user) -> APIClient:
    """A client with a session, and CSRF checks as a browser meets them."""
    client = APIClient(enforce_csrf_checks=True)
    assert client.login(username=user.username, password=PASSWORD)
    return client
