"""What the page tests share."""

import pytest
from django.urls import reverse

from tests.pages.world import World, world


@pytest.fixture
def made(db) -> World:
    return world()


@pytest.fixture
def as_(client, made):
    """``as_("geochemist")`` is a client signed in with that role."""

    def sign_in(role: str):
        client.force_login(made.person(role))
        return client

    return sign_in


@pytest.fixture
def at(made):
    """``at("well", pk)`` is the address of a page of the project."""

    def address(name: str, *args: object) -> str:
        return reverse(name, args=[made.slug, *args])

    return address
