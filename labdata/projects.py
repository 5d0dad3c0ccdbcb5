"""Opening a project."""

from django.contrib.auth.models import User
from django.core.exceptions import ValidationError
from django.db import transaction
from django.utils.text import slugify

from labdata import audit
from labdata.access import GRANTS, Action, AnyUser
from labdata.errors import Conflict, InvalidInput, NotAllowed
from labdata.models import Membership, Project, Role

DEMONSTRATION = "demo"


def may_open_project(user: AnyUser) -> bool:
    """Staff, and whoever administers a project already."""
    if not user.is_authenticated or not user.is_active:
        return False
    if getattr(user, "is_staff", False):
        return True
    administering = [role for role in Role if Action.ADMINISTER in GRANTS[role]]
    return Membership.objects.filter(user_id=user.pk, role__in=administering).exists()


def open_project(*, user: User, name: str, slug: str = "", description: str = "") -> Project:
    """A new project with ``user`` as its administrator. Raises NotAllowed, InvalidInput, Conflict."""
    if not may_open_project(user):
        raise NotAllowed(
            f"{user} may not open a project.", remedy="Staff and administrators of an existing project may."
        )
    slug = slug or slugify(name)[:60]
    if not slug or slug != slugify(slug):
        raise InvalidInput(
            f"«{slug}» is no short name for addresses.", remedy="Use small letters, digits and hyphens.", field="slug"
        )
    with transaction.atomic():
        if Project.objects.filter(slug=slug).exists():
            raise Conflict(f"The short name «{slug}» is taken.", remedy="Choose another one.", field="slug")
        project = Project.objects.create(slug=slug, name=name.strip(), description=description.strip())
        Membership.objects.create(project=project, user=user, role=Role.ADMINISTRATOR)
        audit.record(
            "project.opened",
            project,
            actor=user,
            project=project,
            after={"slug": slug, "name": project.name, "administrator": user.username},
        )
    return project


def open_from_command_line(slug: str) -> Project:
    """A project made by the machine's owner: the installation's administrators administer it.

    In a home that holds the demonstration, its members belong to the new project as well, in the same roles, so
    that a visitor can take files of their own through every step. Raises InvalidInput.
    """
    project = checked(slug)
    with transaction.atomic():
        project.save()
        members = Membership.objects.filter(project__slug=DEMONSTRATION).values_list("user", "role")
        owners = User.objects.filter(is_superuser=True, is_active=True).values_list("pk", flat=True)
        roles = sorted({*members, *((owner, Role.ADMINISTRATOR.value) for owner in owners)})
        Membership.objects.bulk_create(Membership(project=project, user_id=user, role=role) for user, role in roles)
        after = {"slug": slug, "name": project.name, "members": [list(role) for role in roles]}
        audit.record("project.opened", project, actor=None, project=project, after=after)
    return project


def checked(slug: str) -> Project:
    """An unsaved project of that short name. Raises InvalidInput."""
    project = Project(slug=slug, name=slug)
    try:
        project.full_clean()
    except ValidationError as trouble:
        raise InvalidInput(
            f"«{slug}» cannot be a project: {'; '.join(trouble.messages)}",
            remedy="Use small letters, digits and hyphens.",
            project=slug,
        ) from trouble
    return project
