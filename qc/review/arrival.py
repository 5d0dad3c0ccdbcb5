"""What has landed comes to the reviewer's desk: into the well's open set, decisions of unchanged values with it."""

from collections import Counter
from collections.abc import Iterable, Iterator
from itertools import islice
from typing import TYPE_CHECKING, TypeVar
from uuid import UUID, uuid4

from django.db.models import Max

from labdata import fixity
from labdata.models import Analysis, Result, Well
from labdata.registry import bulk
from qc.models import Decision, ReviewItem, ReviewSet, ReviewSetState, Verdict
from qc.review import changes
from qc.review.deciding import BATCH_SIZE
from qc.review.seal import holds
from qc.review.signing import break_signature
from qc.review.standing import standing, valid_signature

if TYPE_CHECKING:
    from labdata.registry.services import Landed

T = TypeVar("T")
CHUNK = 5000


def take_in(landed: "Landed") -> None:
    """Put the analyses that landed into review sets, inside the caller's transaction.

    An analysis that replaces an earlier one joins its set; any other joins its well's open set, and a new set is
    opened where all are signed. Unchanged values keep their verdicts. A signed set whose seal no longer holds
    (a value changed, came or went) is re-opened. Laboratory controls belong to no well and are not decided on.
    """
    wells = {
        analysis: well
        for some in _chunks(landed.analysis_ids)
        for analysis, well in Analysis.objects.filter(pk__in=some, sample__isnull=False).values_list(
            "pk", "sample__well"
        )
    }
    places = _places(wells, landed.replaced_analyses)
    bulk.insert(
        ReviewItem, ("review_set_id", "analysis_id"), ((place.pk, analysis) for analysis, place in places.items())
    )
    batch = uuid4()
    carried = _carry(landed.unchanged, places, batch)
    for review_set, count in _touched(places, landed.withdrawn).items():
        kept = fixity.facts("decisions", review_set.pk, batch) if carried[review_set.pk] else {}
        _settle(review_set, count, carried[review_set.pk], landed, kept)


def _places(wells: dict[int, int], replaced: dict[int, int]) -> dict[int, ReviewSet]:
    """The set of each analysis that arrived; ``wells``: analysis id -> well id."""
    former = {
        item.analysis_id: item.review_set
        for some in _chunks(replaced.values())
        for item in ReviewItem.objects.filter(analysis__in=some).select_related("review_set")
    }
    shared = {review_set.pk: review_set for review_set in former.values()}
    open_sets: dict[int, ReviewSet] = {}
    places = {}
    for analysis, well in wells.items():
        old = former.get(replaced.get(analysis, 0))
        if old is not None:
            places[analysis] = shared[old.pk]
            continue
        if well not in open_sets:
            found = _open_set(well)
            open_sets[well] = shared.setdefault(found.pk, found)
        places[analysis] = open_sets[well]
    return places


def _open_set(well_id: int) -> ReviewSet:
    """The well's latest set in review, or a new one."""
    well = Well.objects.select_for_update(of=("self",)).select_related("project").get(pk=well_id)
    sets = ReviewSet.objects.filter(well=well)
    found = sets.filter(state=ReviewSetState.OPEN).order_by("-number").first()
    if found:
        return found
    last = sets.aggregate(last=Max("number"))["last"] or 0
    return ReviewSet.objects.create(project=well.project, well=well, number=last + 1)


def _carry(unchanged: Iterable[tuple[int, int]], places: dict[int, ReviewSet], batch: UUID) -> Counter[int]:
    """Carry standing verdicts to the results that repeat the values; returns how many per review set."""
    counts = Counter[int]()
    for some in _chunks(unchanged):
        rows = _carried(dict(some), places, batch)
        Decision.objects.bulk_create(rows, batch_size=BATCH_SIZE)
        counts.update(row.review_set_id for row in rows)
    return counts


def _carried(successors: dict[int, int], places: dict[int, ReviewSet], batch: UUID) -> list[Decision]:
    """Decisions on new results that repeat those standing on the old: same person, same time, same words."""
    stands = standing(Result.objects.filter(pk__in=list(successors)))
    homes = dict(Result.objects.filter(pk__in=list(successors.values())).values_list("pk", "analysis_id"))
    former = Decision.objects.in_bulk([s.decision for s in stands.values() if s.verdict != Verdict.UNDECIDED])
    return [
        Decision(
            review_set=places[homes[successors[d.result_id]]], result_id=successors[d.result_id], verdict=d.verdict,
            reason=d.reason, text=d.text, decided_by_id=d.decided_by_id, decided_at=d.decided_at, batch=batch,
            carried_from=d,
        )
        for d in former.values()
        if homes.get(successors[d.result_id], 0) in places
    ]  # fmt: skip


def _touched(places: dict[int, ReviewSet], withdrawn: Iterable[int]) -> dict[ReviewSet, int]:
    """Every set that something arrived in or was withdrawn from, with how many analyses arrived."""
    counts = Counter(places.values())
    for some in _chunks(withdrawn):
        for review_set in ReviewSet.objects.filter(items__analysis__results__in=some).distinct():
            counts.setdefault(review_set, 0)
    return counts


def _chunks(things: Iterable[T]) -> Iterator[list[T]]:
    """``things`` in lists short enough for one statement's parameters."""
    rest = iter(things)
    while some := list(islice(rest, CHUNK)):
        yield some


def _settle(review_set: ReviewSet, arrived: int, carried: int, landed: "Landed", facts: dict[str, str]) -> None:
    """Raise the version, leave the record, and re-open a signed set that no longer says what was signed."""
    held = changes.lock(review_set)
    changes.bump(held)
    what = f"brought {arrived} analyses of report {landed.report}"
    changes.log(
        changes.TAKEN_IN, held, None, what, report=str(landed.report), arrived=arrived, carried=carried, facts=facts
    )
    signature = valid_signature(held)
    if signature and not holds(signature):
        break_signature(held, actor=None, reason=f"Report {landed.report} changed, added or withdrew signed values.")
