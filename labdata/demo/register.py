"""Wells with what was recorded along them, laboratories, and the way of the samples to them."""

from collections.abc import Iterable, Iterator
from datetime import UTC, datetime, timedelta

from django.contrib.auth.models import User
from django.db import models, transaction

from labdata import audit
from labdata.demo.basin import BRACKWATER, LABORATORIES, NINEFOLD, WELLS, DemoLaboratory, DemoWell
from labdata.models import (
    AnalysisRequest,
    CasingShoe,
    Consignment,
    CoreRun,
    CustodyEvent,
    FormationTop,
    Laboratory,
    Method,
    MudInterval,
    Project,
    ReferenceMaterial,
    Sample,
    SurveyStation,
    Well,
    WellAlias,
)
from labdata.registry.names import name_key
from qc.models import RuleSet
from qc.rulesets import new_version

SENT = datetime(2026, 1, 12, 10, 30, tzinfo=UTC)
CORE_STORE = "Norrowland core store, rack 14"
CAUTION = "Cuttings from below 2520 m were drilled with oil-based mud: wash with solvent before pyrolysis or say so."
OWN_LIMITS = {"toc_floor_for_indices": {"toc_warn": 0.4}}
OWN_REASON = "Duplicates of both laboratories agree within 10 % down to 0.4 wt% TOC in this basin."
# consignment number, laboratory, wells, methods reported, methods awaited, cautions
CONSIGNMENTS = (
    ("QB-C-001", BRACKWATER, ("Tarrow 1",), ("pyrolysis", "reflectance"), ("isotopes",), CAUTION),
    ("QB-C-002", NINEFOLD, ("Tarrow 2",), ("pyrolysis",), (), ""),
    ("QB-C-003", NINEFOLD, ("Fennick 1", "Sallowby 1"), ("pyrolysis", "carbon"), (), "Keep plugs for thin sections."),
)


@transaction.atomic
def set_up_registry(project: Project) -> dict[str, Well]:
    """Laboratories and wells of the basin, made where they are not there; returns the wells by name."""
    for laboratory in LABORATORIES:
        _laboratory(project, laboratory)
    return {plan.name: _well(project, plan) for plan in WELLS}


def _laboratory(project: Project, plan: DemoLaboratory) -> None:
    laboratory, made = Laboratory.objects.get_or_create(project=project, name=plan.name)
    if not made:
        return
    ReferenceMaterial.objects.create(
        project=project, laboratory=laboratory, name=f"{plan.name.split()[0]} house shale", lot="2",
        certificate={"TOC": [2.94, 0.06], "S2": [10.6, 0.4], "TMAX": [431.0, 1.5]},
    )  # fmt: skip
    audit.record("laboratory.registered", laboratory, actor=None, project=project, after={"name": plan.name})


def _well(project: Project, plan: DemoWell) -> Well:
    found = Well.objects.filter(project=project, uwi=plan.uwi).first()
    if found:
        return found
    well = Well.objects.create(
        project=project, name=plan.name, name_key=name_key(plan.name), uwi=plan.uwi, operator=plan.operator,
        country=plan.country, latitude=plan.latitude, longitude=plan.longitude, crs="EPSG:4326",
        datum_kind=plan.datum, datum_elevation_m=plan.datum_elevation, ground_elevation_m=plan.ground_elevation,
        td_md_m=plan.td,
    )  # fmt: skip
    for row in _along(well, plan):
        row.save(force_insert=True)
    after = {"name": plan.name, "uwi": plan.uwi, "td_md_m": plan.td}
    audit.record("well.registered", well, actor=None, project=project, after=after)
    return well


def _along(well: Well, plan: DemoWell) -> Iterator[models.Model]:
    """Everything recorded along the well, as unsaved rows."""
    for name in {name_key(alias): alias for alias in plan.aliases if name_key(alias) != well.name_key}.values():
        yield WellAlias(well=well, name=name, name_key=name_key(name))
    for unit, depth in plan.tops:
        yield FormationTop(well=well, name=unit.name, top_md_m=depth)
    for depth, diameter in plan.casing:
        yield CasingShoe(well=well, md_m=depth, diameter_in=diameter)
    for mud in plan.muds:
        yield MudInterval(well=well, top_md_m=mud.top, base_md_m=mud.base, kind=mud.kind, additives=mud.additives)
    for run in plan.cores:
        yield CoreRun(
            well=well, number=run.number, top_md_m=run.top, base_md_m=run.base, recovered_m=run.recovered,
            shift_to_log_m=run.shift_to_log,
        )  # fmt: skip
    for depth, inclination, azimuth in plan.survey:
        yield SurveyStation(well=well, md_m=depth, inclination_deg=inclination, azimuth_deg=azimuth)


def set_up_rules(project: Project, geochemist: User) -> None:
    """The project's own version of the rules, once: indices are warned of from 0.4 wt% TOC down instead of 0.5."""
    if not RuleSet.objects.filter(project=project).exists():
        new_version(project=project, changes=OWN_LIMITS, author=geochemist, reason=OWN_REASON)


@transaction.atomic
def set_up_custody(project: Project, coordinator: User) -> None:
    """Consignments of the samples that have landed, what was ordered, and where the samples have been."""
    for number, laboratory, wells, reported, awaited, cautions in CONSIGNMENTS:
        samples = list(Sample.objects.filter(well__project=project, well__name__in=wells))
        if not samples or Consignment.objects.filter(project=project, number=number).exists():
            continue
        consignment = Consignment.objects.create(
            project=project, laboratory=Laboratory.objects.get(project=project, name=laboratory.name), number=number,
            sent_at=SENT, cautions=cautions,
        )  # fmt: skip
        consignment.samples.set(samples)
        _order(consignment, reported, AnalysisRequest.State.REPORTED)
        _order(consignment, awaited, AnalysisRequest.State.REQUESTED)
        CustodyEvent.objects.bulk_create(_journey(samples, laboratory, coordinator), batch_size=1000)
        after = {"number": number, "laboratory": laboratory.name, "samples": len(samples)}
        audit.record("consignment.sent", consignment, actor=coordinator, project=project, after=after)


def _order(consignment: Consignment, methods: Iterable[str], state: AnalysisRequest.State) -> None:
    """What was ordered with the consignment, due six weeks after it was sent."""
    due = (SENT + timedelta(weeks=6)).date()
    for method in Method.objects.filter(code__in=list(methods)):
        AnalysisRequest.objects.create(consignment=consignment, method=method, state=state, due=due)


def _journey(samples: Iterable[Sample], laboratory: DemoLaboratory, coordinator: User) -> Iterator[CustodyEvent]:
    """Stored, sent, received: three events a sample."""
    steps = (
        (CustodyEvent.Kind.STORED, CORE_STORE, SENT - timedelta(days=40)),
        (CustodyEvent.Kind.SENT, CORE_STORE, SENT),
        (CustodyEvent.Kind.RECEIVED, laboratory.name, SENT + timedelta(days=3, hours=2)),
    )
    for sample in samples:
        for kind, place, at in steps:
            yield CustodyEvent(sample=sample, kind=kind, place=place, at=at, recorded_by=coordinator)
