"""A later version of a report takes the place of the earlier one, value by value; the earlier stays readable."""

from collections import defaultdict, deque
from dataclasses import dataclass, field
from typing import Any

from labdata.models import Analysis, Report, Result

LISTED = 1000  # differences written out with the report; beyond that only counted


@dataclass(frozen=True)
class OldAnalysis:
    """An analysis of the version that is superseded."""

    pk: int
    method: str
    sample: int | None
    well: int | None
    label: str
    replicate: int
    role: str
    lab_number: str
    reference: int | None


@dataclass(frozen=True)
class OldResult:
    pk: int
    value: float | None
    qualifier: str
    text: str


@dataclass
class Predecessor:
    """The earlier version's current analyses, handed out one by one to the new rows that repeat them."""

    report: Report
    analyses: list[OldAnalysis]
    results: dict[int, dict[str, OldResult]]
    _queues: list[dict[Any, deque[OldAnalysis]]] = field(default_factory=list)
    _taken: set[int] = field(default_factory=set)

    @classmethod
    def of(cls, report: Report) -> "Predecessor":
        """Read what the report says now."""
        fields = (
            "pk",
            "method__code",
            "sample_id",
            "sample__well_id",
            "sample__label",
            "replicate",
            "role",
            "lab_number",
            "reference_material_id",
        )
        found = Analysis.objects.current().filter(report=report).order_by("table", "line").values_list(*fields)
        analyses = [
            OldAnalysis(pk, method, sample, well, label or "", *rest)
            for pk, method, sample, well, label, *rest in found
        ]
        results: dict[int, dict[str, OldResult]] = defaultdict(dict)
        rows = Result.objects.filter(analysis__report=report, current=True)
        for analysis, code, pk, value, qualifier, text in rows.values_list(
            "analysis_id", "analyte__code", "pk", "value", "qualifier", "value_reported"
        ):
            results[analysis][code] = OldResult(pk, value, qualifier, text)
        made = cls(report, analyses, results)
        made._queues = [made._queue(key) for key in _KEYS]
        return made

    def _queue(self, key: Any) -> dict[Any, deque[OldAnalysis]]:
        queue: dict[Any, deque[OldAnalysis]] = defaultdict(deque)
        for analysis in self.analyses:
            if (name := key(analysis)) is not None:
                queue[name].append(analysis)
        return queue

    def take(self, wanted: OldAnalysis, step: int) -> OldAnalysis | None:
        """The next analysis not yet taken that has the same key as ``wanted`` at ``step`` (see ``_KEYS``)."""
        name = _KEYS[step](wanted)
        queue = self._queues[step].get(name) if name is not None else None
        while queue:
            found = queue.popleft()
            if found.pk not in self._taken:
                self._taken.add(found.pk)
                return found
        return None

    @property
    def left(self) -> list[OldAnalysis]:
        """Analyses that no new row repeats."""
        return [analysis for analysis in self.analyses if analysis.pk not in self._taken]


def _same_sample(analysis: OldAnalysis) -> Any:
    if analysis.sample is None:
        return (analysis.role, analysis.reference, analysis.method)
    return (analysis.sample, analysis.method)


def _same_lab_number(analysis: OldAnalysis) -> Any:
    return (analysis.lab_number, analysis.method) if analysis.lab_number else None


def _same_label(analysis: OldAnalysis) -> Any:
    return (analysis.well, analysis.label, analysis.method) if analysis.label and analysis.well else None


# In this order: the sample itself, the laboratory's number (a corrected depth or name), the sample number in the well.
_KEYS = (_same_sample, _same_lab_number, _same_label)
STEPS = len(_KEYS)


def withdraw(analyses: list[int]) -> None:
    """Mark analyses and their results as no longer current; nothing else of them changes."""
    for start in range(0, len(analyses), 500):
        part = analyses[start : start + 500]
        Result.objects.filter(analysis__in=part, current=True).update(current=False)
        Analysis.objects.filter(pk__in=part).update(current=False)


@dataclass
class Difference:
    """What the later version changes, in words a person can read."""

    superseded: int = 0
    added: int = 0
    changed: int = 0
    withdrawn: int = 0
    unchanged: int = 0
    values: list[dict[str, Any]] = field(default_factory=list)

    def tell(self, what: str, sample: str, analyte: str, was: str, now: str) -> None:
        setattr(self, what, getattr(self, what) + 1)
        if len(self.values) < LISTED and what != "unchanged":
            self.values.append({"what": what, "sample": sample, "analyte": analyte, "was": was, "now": now})

    def as_dict(self, revision: int | None) -> dict[str, Any]:
        """For Report.difference."""
        counts = {name: getattr(self, name) for name in ("superseded", "added", "changed", "withdrawn", "unchanged")}
        return {**counts, "revision": revision, "values": self.values}
