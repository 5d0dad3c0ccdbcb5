"""What a coordinator records about a well by hand: its header, and what lies along it."""

from collections.abc import Mapping
from typing import Any

from django.contrib.auth.models import User
from django.core.exceptions import ValidationError
from django.db import models, transaction

from labdata import audit
from labdata.access import Action, require
from labdata.errors import Conflict, InvalidInput, NotFound
from labdata.models import (
    CasingShoe,
    CoreRun,
    FormationTop,
    MudInterval,
    SurveyStation,
    Well,
    WellAlias,
    WellIdentifier,
)
from labdata.registry.names import name_key

HEADER = (
    "name", "uwi", "operator", "field", "country", "latitude", "longitude", "crs", "datum_kind",
    "datum_elevation_m", "ground_elevation_m", "water_depth_m", "td_md_m",
)  # fmt: skip

#: What lies along a well, by the word that addresses and forms use for it.
ALONG: dict[str, type[models.Model]] = {
    "top": FormationTop,
    "core": CoreRun,
    "casing": CasingShoe,
    "mud": MudInterval,
    "station": SurveyStation,
    "alias": WellAlias,
    "identifier": WellIdentifier,
}


def edit_well(*, user: User, well: Well, values: Mapping[str, Any], reason: str) -> list[str]:
    """Set header fields of a well; returns the names of those that changed.

    A new name keeps the old one as an alias, so that reports under it still find the well. Raises NotAllowed,
    InvalidInput (no reason, an impossible value), Conflict (another well has this identifier or name).
    """
    require(user, well.project, Action.REGISTER)
    _need_reason(reason)
    with transaction.atomic():
        held = Well.objects.select_for_update().get(pk=well.pk)
        before = {name: getattr(held, name) for name in HEADER}
        changed = [name for name in HEADER if name in values and values[name] != before[name]]
        for name in changed:
            setattr(held, name, values[name])
        if not changed:
            return []
        held.name_key = name_key(held.name)
        _check(held)
        held.save()
        if "name" in changed and name_key(before["name"]) != held.name_key:
            WellAlias.objects.get_or_create(
                well=held, name_key=name_key(before["name"]), defaults={"name": before["name"]}
            )
        audit.record(
            "well.edited",
            held,
            actor=user,
            project=held.project,
            before={name: before[name] for name in changed},
            after={name: getattr(held, name) for name in changed},
            reason=reason,
        )
    return changed


def add_along(*, user: User, well: Well, kind: str, values: Mapping[str, Any]) -> models.Model:
    """Record a formation top, core run, casing shoe, mud interval, survey station, alias or identifier.

    Raises NotAllowed, InvalidInput (unknown kind, impossible value), Conflict (recorded already).
    """
    require(user, well.project, Action.REGISTER)
    thing = _model(kind)(**values, **({"name_key": name_key(values["name"])} if kind == "alias" else {}))
    thing.well = well  # type: ignore[attr-defined]
    with transaction.atomic():
        _check(thing)
        thing.save(force_insert=True)
        audit.record(
            f"well.{kind}_added", well, actor=user, project=well.project, after={"id": thing.pk, **_particulars(thing)}
        )
    return thing


def remove_along(*, user: User, well: Well, kind: str, pk: int, reason: str) -> None:
    """Take out what was recorded by mistake; the audit trail keeps it. Raises NotAllowed, NotFound, InvalidInput."""
    require(user, well.project, Action.REGISTER)
    _need_reason(reason)
    with transaction.atomic():
        thing = _model(kind)._default_manager.filter(well=well, pk=pk).first()
        if thing is None:
            raise NotFound(f"There is no such {kind} at {well}.", remedy="Load the page again.")
        before = {"id": pk, **_particulars(thing)}
        thing.delete()
        audit.record(f"well.{kind}_removed", well, actor=user, project=well.project, before=before, reason=reason)


def _model(kind: str) -> type[models.Model]:
    if kind not in ALONG:
        raise InvalidInput(f"«{kind}» is nothing recorded along a well.", remedy=f"Kinds: {', '.join(ALONG)}.")
    return ALONG[kind]


def _need_reason(reason: str) -> None:
    if not reason.strip():
        raise InvalidInput(
            "A change of the registry needs a reason.", remedy="Say why, in a few words.", field="reason"
        )


def _check(thing: models.Model) -> None:
    """Fields and constraints as the database will see them. Raises Conflict for a duplicate, else InvalidInput."""
    try:
        thing.full_clean()
    except ValidationError as fault:
        found = fault.error_dict if hasattr(fault, "error_dict") else {"__all__": fault.error_list}
        field, errors = next(iter(found.items()))
        duplicate = errors[0].code in {"unique", "unique_together"} or "already exists" in str(errors[0].message)
        message = " ".join(errors[0].messages)
        if duplicate:
            raise Conflict(f"This is recorded already: {message}", remedy="Look at what the well has.") from fault
        named = "" if field == "__all__" else f"{field.replace('_', ' ')}: "
        raise InvalidInput(f"{named}{message}", remedy="Correct the value.", field=field) from fault


def _particulars(thing: models.Model) -> dict[str, Any]:
    return {
        field.name: getattr(thing, field.name)
        for field in thing._meta.concrete_fields
        if field.name not in {"id", "well", "name_key"}
    }
