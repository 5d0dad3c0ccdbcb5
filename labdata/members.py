"""Who belongs to a project and in which role; making accounts. Every change is audited."""

from django.contrib.auth.models import User
from django.contrib.auth.password_validation import validate_password
from django.contrib.auth.validators import UnicodeUsernameValidator
from django.core.exceptions import ValidationError
from django.db import transaction

from labdata import audit
from labdata.access import Action, actions, find_user, require, visible_projects
from labdata.errors import Conflict, InvalidInput, NotAllowed, NotFound
from labdata.models import Membership, Project, Role


def add_role(*, by: User, project: Project, username: str, role: str) -> Membership:
    """Give an account a role. Raises NotAllowed, NotFound (account), InvalidInput (role), Conflict (held already)."""
    require(by, project, Action.ADMINISTER)
    _check_role(role)
    return grant(actor=by, project=project, user=find_user(username.strip()), role=role)


def grant(*, actor: User | None, project: Project, user: User, role: str) -> Membership:
    """The change itself; ``actor`` None is the machine's owner at the command line. Raises Conflict (held already)."""
    with transaction.atomic():
        membership, made = Membership.objects.get_or_create(project=project, user=user, role=role)
        if not made:
            raise Conflict(f"{user} is {Role(role).label} of this project already.", field="role")
        after = {"user": user.username, "role": role}
        audit.record("member.role_added", membership, actor=actor, project=project, after=after)
    return membership


def remove_role(*, by: User, project: Project, username: str, role: str) -> None:
    """Take a role away. The last administrator stays. Raises NotAllowed, NotFound, Conflict."""
    require(by, project, Action.ADMINISTER)
    with transaction.atomic():
        held = Membership.objects.select_for_update().filter(project=project, role=role)
        membership = held.filter(user__username=username).first()
        if membership is None:
            raise NotFound(f"{username} does not hold the role «{role}» here.", remedy="Load the page again.")
        if role == Role.ADMINISTRATOR and held.count() == 1:
            raise Conflict(f"{username} is the last administrator.", remedy="Make somebody else administrator first.")
        before = {"user": username, "role": role}
        audit.record("member.role_removed", membership, actor=by, project=project, before=before)
        membership.delete()


def create_account(
    *, by: User, project: Project, username: str, password: str, role: str, first_name: str = "", last_name: str = ""
) -> User:
    """A new account with its first role in the project. Raises NotAllowed, InvalidInput, Conflict (name taken)."""
    require(by, project, Action.ADMINISTER)
    _check_role(role)
    username = username.strip()
    user = User(username=username, first_name=first_name.strip(), last_name=last_name.strip())
    _check_account(user, password)
    with transaction.atomic():
        if User.objects.filter(username__iexact=username).exists():
            raise Conflict(
                f"The account name «{username}» is taken.",
                remedy="If it is the same person, add a role to that account instead.",
                field="username",
            )
        user.set_password(password)
        user.save()
        Membership.objects.create(project=project, user=user, role=role)
        audit.record("account.created", user, actor=by, project=project, after={"user": username, "role": role})
    return user


def set_password(*, by: User, project: Project, username: str, password: str) -> None:
    """A new password for a member who has lost theirs.

    Only where ``by`` administers every project the member belongs to: else it would open other people's projects.
    Raises NotAllowed, NotFound (no member), InvalidInput (password).
    """
    require(by, project, Action.ADMINISTER)
    user = User.objects.filter(username=username, memberships__project=project).distinct().first()
    if user is None:
        raise NotFound(f"{username} is no member of this project.", remedy="Load the page again.", field="username")
    elsewhere = [one for one in visible_projects(user) if Action.ADMINISTER not in actions(by, one)]
    if elsewhere or (user.is_staff and user != by):
        raise NotAllowed(
            f"{username} also has rights that you do not administer.",
            remedy="Whoever runs the service sets this password.",
            field="username",
        )
    _check_account(user, password)
    with transaction.atomic():
        user.set_password(password)
        user.save(update_fields=["password"])
        audit.record("account.password_set", user, actor=by, project=project, after={"user": username})


def _check_role(role: str) -> None:
    if role not in Role.values:
        raise InvalidInput(f"«{role}» is no role.", remedy=f"Roles: {', '.join(Role.values)}.", field="role")


def _check_account(user: User, password: str) -> None:
    """Name and password as an account needs them. Raises InvalidInput naming the field."""
    try:
        UnicodeUsernameValidator()(user.username)
    except ValidationError as fault:
        raise InvalidInput(
            f"«{user.username}» is no account name.", remedy="Use letters, digits and @ . + - _.", field="username"
        ) from fault
    try:
        validate_password(password, user)
    except ValidationError as fault:
        raise InvalidInput(
            " ".join(fault.messages), remedy="A phrase of several words is long and easy to keep.", field="password"
        ) from fault
