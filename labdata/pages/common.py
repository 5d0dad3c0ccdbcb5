"""What the page views share: the project of an address, one row of it, pages of a list, a form sent to a service."""

from collections.abc import Callable
from typing import Any, TypeVar, cast

from django import forms
from django.contrib.auth.models import User
from django.core.paginator import Page, Paginator
from django.db.models import Model, QuerySet
from django.http import HttpRequest

from labdata.access import Action, require, visible_projects
from labdata.errors import KerogateError, NotFound
from labdata.models import Project

PAGE_SIZE = 50
M = TypeVar("M", bound=Model)
T = TypeVar("T")


def person(request: HttpRequest) -> User:
    """The signed-in user; LoginRequiredMiddleware lets nobody else reach a page."""
    return cast(User, request.user)


def open_project(request: HttpRequest, slug: str, action: Action = Action.VIEW) -> Project:
    """The project at hand. Raises NotFound for a stranger, NotAllowed for a member without the right."""
    project = visible_projects(request.user).filter(slug=slug).first()
    if project is None:
        raise NotFound(f"There is no project «{slug}».", remedy="Ask its administrator for a membership.")
    require(request.user, project, action)
    return project


def find(rows: QuerySet[M], what: str, **lookup: Any) -> M:
    """The one row of ``rows`` that fits. Raises NotFound, naming ``what`` was looked for."""
    row = rows.filter(**lookup).first()
    if row is None:
        named = ", ".join(str(value) for value in lookup.values())
        raise NotFound(f"There is no {what} {named} in this project.", remedy="Look it up in the list.")
    return row


def page_of(request: HttpRequest, rows: Any, size: int = PAGE_SIZE) -> Page[Any]:
    """The page of ``rows`` that the address asks for; a number beyond the end means the last page."""
    return Paginator(rows, size).get_page(request.GET.get("page"))


def attempt(form: forms.BaseForm, service: Callable[[], T]) -> T | None:
    """What ``service`` answers, or None with its refusal written on the form."""
    try:
        return service()
    except KerogateError as refusal:
        field = refusal.where.get("field")
        form.add_error(field if field in form.fields else None, str(refusal))
        return None
