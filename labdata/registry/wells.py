"""Making the wells that a file brings."""

from labdata.intake.matching import WellDirectory, WellPlan
from labdata.intake.names import name_key
from labdata.intake.prepared import Prepared
from labdata.models import Well, WellAlias


def make_wells(prepared: Prepared) -> tuple[dict[tuple[str, str], int], int]:
    """((name, uwi) of the file -> well id, number made). A well made meanwhile by another file is taken, not doubled."""
    directory = WellDirectory(prepared.project)
    made = 0
    for plan in {id(plan): plan for plan in prepared.wells.values()}.values():
        if plan.pk is None:
            found = directory.find(plan.name, plan.uwi)
            if len(found) == 1:
                plan.pk = found.pop()
            else:
                plan.pk = _create(prepared, plan)
                made += 1
        _add_aliases(plan)
    return {key: plan.pk for key, plan in prepared.wells.items() if plan.pk is not None}, made


def _create(prepared: Prepared, plan: WellPlan) -> int:
    well = Well.objects.create(
        project=prepared.project, name=plan.name[:120], name_key=name_key(plan.name), uwi=plan.uwi[:40], **plan.details
    )
    return well.pk


def _add_aliases(plan: WellPlan) -> None:
    for alias in sorted(plan.aliases):
        key = name_key(alias)
        if key and key != name_key(plan.name):
            WellAlias.objects.get_or_create(well_id=plan.pk, name_key=key, defaults={"name": alias[:120]})
