"""The filters of the lists. A value that cannot mean anything is refused with what would do."""

import re
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime, time
from typing import Any

import django_filters
from django import forms
from django.db.models import Exists, F, OuterRef, Q, QuerySet, Subquery, Value
from django.db.models.functions import Coalesce
from django.utils.dateparse import parse_date, parse_datetime
from rest_framework.exceptions import ValidationError

from labdata.access import Action
from labdata.api.callers import Caller, caller_of
from labdata.models import (
    Analysis,
    Analyte,
    AuditEntry,
    Method,
    Project,
    Release,
    Result,
    Sample,
    Upload,
    Well,
)
from labdata.registry.names import name_key
from qc.models import Decision, Flag, QcRun, ReviewSet, ReviewSetState, RuleSet, Severity, SignOff, Verdict

ID_LIMIT = 10**18


class MomentField(forms.CharField):
    """An ISO 8601 time, or a day (its start); without an offset it is UTC."""

    def clean(self, value: Any) -> datetime | None:
        text = super().clean(value)
        if not text:
            return None
        if re.search(r" \d\d:?\d\d$", text):  # "+" in an address is read as a blank
            text = "+".join(text.rsplit(" ", 1))
        try:
            day = parse_date(text)
            moment = datetime.combine(day, time()) if day else parse_datetime(text)
        except ValueError:
            moment = None
        if moment is None:
            raise forms.ValidationError(f"«{text}» is no time; write 2026-03-01 or 2026-03-01T09:30:00Z.")
        return moment if moment.tzinfo else moment.replace(tzinfo=UTC)


class Moment(django_filters.IsoDateTimeFilter):
    """A time or a day."""

    field_class = MomentField


class DepthField(forms.FloatField):
    default_error_messages = {"invalid": "This is no depth; write metres measured depth, such as 2310.5."}


class Depth(django_filters.NumberFilter):
    """Metres measured depth."""

    field_class = DepthField

    def get_max_validator(self) -> None:
        return None


class YesOrNoField(forms.CharField):
    def clean(self, value: Any) -> bool | None:
        text = super().clean(value)
        if text and text.lower() not in {"true", "false"}:
            raise forms.ValidationError(f"«{text}» is neither true nor false.")
        return text.lower() == "true" if text else None


class YesOrNo(django_filters.BooleanFilter):
    """true or false."""

    field_class = YesOrNoField


class OneOf(django_filters.ChoiceFilter):
    """One of a short list, which the refusal names."""

    def __init__(self, values: Sequence[str], **more: Any) -> None:
        message = f"«%(value)s» is not known; known: {', '.join(values)}."
        super().__init__(
            choices=[(value, value) for value in values], error_messages={"invalid_choice": message}, **more
        )


class Rows(django_filters.FilterSet):
    """What can be asked of every list: the project, and what changed.

    ``paths`` leads from a row to what a filter looks at; ``many`` names those that lead to several rows.
    """

    paths: Mapping[str, str] = {}
    many: frozenset[str] = frozenset()
    project = django_filters.CharFilter(method="by_project", label="Slug of the project.")
    changed_since = Moment(method="by_change", label="Made or changed at or after this time (ISO 8601).")

    @property
    def caller(self) -> Caller:
        return caller_of(self.request)

    def narrow(self, rows: QuerySet[Any], name: str, lookup: str, value: Any) -> QuerySet[Any]:
        """Rows whose path ``name`` fits."""
        condition = {f"{self.paths[name]}{lookup}": value}
        if name in self.many:
            return rows.filter(pk__in=rows.model._default_manager.filter(**condition).order_by().values("pk"))
        return rows.filter(**condition)

    def by_project(self, rows: QuerySet[Any], name: str, slug: str) -> QuerySet[Any]:
        return self.narrow(rows, "project", "", self.caller.project(slug).pk)

    def by_change(self, rows: QuerySet[Any], name: str, moment: datetime) -> QuerySet[Any]:
        return self.narrow(rows, "changed", "__gte", moment)


class RowsOfWells(Rows):
    """Lists whose rows belong to wells."""

    well = django_filters.CharFilter(method="by_well", label="Name, alias, UWI or id of the well.")

    def by_well(self, rows: QuerySet[Any], name: str, text: str) -> QuerySet[Any]:
        key = name_key(text)
        named = Q(name_key=key) | Q(uwi=text) | Q(aliases__name_key=key) | Q(identifiers__value=text)
        if text.isascii() and text.isdigit() and int(text) < ID_LIMIT:
            named |= Q(pk=int(text))
        found = set(self.caller.visible(Well.objects.filter(named)).values_list("pk", flat=True))
        if not found:
            raise ValidationError({"well": [f"There is no well «{text}»; GET /api/v1/wells lists them."]})
        return self.narrow(rows, "well", "__in", found)


class RowsOfSamples(RowsOfWells):
    """Lists whose rows belong to samples and what was measured on them."""

    formation = django_filters.CharFilter(method="by_formation", label="Formation as reported.")
    method = django_filters.CharFilter(method="by_method", label="Code of the method.")
    analyte = django_filters.CharFilter(method="by_analyte", label="Code of the analyte.")
    top_m__gte = Depth(method="by_top", label="Top of the sample at or below this depth [m MD].")
    base_m__lte = Depth(method="by_base", label="Base of the sample at or above this depth [m MD].")

    def by_formation(self, rows: QuerySet[Any], name: str, text: str) -> QuerySet[Any]:
        return self.narrow(rows, "sample", "formation__iexact", text)

    def by_method(self, rows: QuerySet[Any], name: str, code: str) -> QuerySet[Any]:
        known = list(Method.objects.values_list("code", flat=True))
        if code not in known:
            raise ValidationError({"method": [f"There is no method «{code}»; known: {', '.join(known)}."]})
        return self.narrow(rows, "method", "", code)

    def by_analyte(self, rows: QuerySet[Any], name: str, code: str) -> QuerySet[Any]:
        ours = Q(project=None) | Q(project__in=self.caller.projects)
        if not Analyte.objects.filter(ours, code__iexact=code).exists():
            raise ValidationError({"analyte": [f"There is no analyte «{code}»; codes are such as TOC, S2, TMAX."]})
        return self.narrow(rows, "analyte", "__iexact", code)

    def by_top(self, rows: QuerySet[Any], name: str, depth: float) -> QuerySet[Any]:
        return self.narrow(rows, "sample", "top_md_m__gte", depth)

    def by_base(self, rows: QuerySet[Any], name: str, depth: float) -> QuerySet[Any]:
        sample = self.paths["sample"]
        ends = rows.annotate(_base=Coalesce(F(f"{sample}base_md_m"), F(f"{sample}top_md_m")))
        return ends.filter(_base__lte=depth)


class ProjectRows(Rows):
    paths = {"project": "pk", "changed": "created_at"}

    class Meta:
        model = Project
        fields: list[str] = []


class WellRows(RowsOfWells):
    paths = {"project": "project", "well": "pk", "changed": "samples__analyses__report__imported_at"}
    many = frozenset({"changed"})

    class Meta:
        model = Well
        fields: list[str] = []


class SampleRows(RowsOfSamples):
    paths = {
        "project": "well__project", "well": "well", "sample": "", "method": "analyses__method__code",
        "analyte": "analyses__results__analyte__code", "changed": "analyses__report__imported_at",
    }  # fmt: skip
    many = frozenset({"method", "analyte", "changed"})

    class Meta:
        model = Sample
        fields: list[str] = []


class AnalysisRows(RowsOfSamples):
    paths = {
        "project": "project", "well": "sample__well", "sample": "sample__", "method": "method__code",
        "analyte": "results__analyte__code", "changed": "report__imported_at",
    }  # fmt: skip
    many = frozenset({"analyte"})
    state = OneOf(ReviewSetState.values, field_name="review_item__review_set__state", label="State of its review set.")
    superseded = YesOrNo(method="by_superseded", label="true: replaced ones; unless told, current.")

    class Meta:
        model = Analysis
        fields: list[str] = []

    def by_superseded(self, rows: QuerySet[Any], name: str, wanted: bool) -> QuerySet[Any]:
        return rows.filter(current=not wanted)

    def filter_queryset(self, queryset: QuerySet[Any]) -> QuerySet[Any]:
        """Current rows unless the superseded ones are asked for."""
        rows = super().filter_queryset(queryset)
        return rows if self.form.cleaned_data.get("superseded") is not None else rows.filter(current=True)


class ResultRows(AnalysisRows):
    paths = {
        "project": "analysis__project", "well": "analysis__sample__well", "sample": "analysis__sample__",
        "method": "analysis__method__code", "analyte": "analyte__code",
    }  # fmt: skip
    many = frozenset()
    state = OneOf(Verdict.values, method="by_verdict", label="Verdict that stands (the same as verdict).")
    verdict = OneOf(Verdict.values, method="by_verdict", label="Verdict that stands.")
    analysis = django_filters.NumberFilter(method="by_analysis", label="Id of the analysis.")
    review_set = django_filters.NumberFilter(method="by_review_set", label="Id of the review set.")

    class Meta:
        model = Result
        fields: list[str] = []

    def by_verdict(self, rows: QuerySet[Any], name: str, verdict: str) -> QuerySet[Any]:
        latest = Decision.objects.filter(result=OuterRef("pk")).order_by("-pk").values("verdict")[:1]
        stands = Coalesce(Subquery(latest), Value(Verdict.UNDECIDED.value))
        return rows.annotate(_verdict=stands).filter(_verdict=verdict)

    def by_analysis(self, rows: QuerySet[Any], name: str, number: Any) -> QuerySet[Any]:
        return rows.filter(analysis=_an_id("analysis", number))

    def by_review_set(self, rows: QuerySet[Any], name: str, number: Any) -> QuerySet[Any]:
        return rows.filter(analysis__review_item__review_set=_an_id("review_set", number))

    def by_change(self, rows: QuerySet[Any], name: str, moment: datetime) -> QuerySet[Any]:
        """Reported, or decided on, since."""
        decided = Exists(Decision.objects.filter(result=OuterRef("pk"), decided_at__gte=moment))
        return rows.filter(Q(analysis__report__imported_at__gte=moment) | decided)


def _an_id(name: str, number: Any) -> int:
    """A number as an id. Raises ValidationError for what cannot be one."""
    if number != int(number) or not 0 < number < ID_LIMIT:
        raise ValidationError({name: [f"«{number}» is no id."]})
    return int(number)


class FlagRows(RowsOfSamples):
    paths = {
        "project": "well__project", "well": "well", "sample": "analysis__sample__", "method": "analysis__method__code",
        "analyte": "analyte", "changed": "run__started_at",
    }  # fmt: skip
    rule = django_filters.CharFilter(field_name="rule", label="Id of the rule.")
    family = django_filters.CharFilter(field_name="family", label="Family of the rule.")
    severity = OneOf(Severity.values, field_name="severity", label="Severity.")
    run = django_filters.NumberFilter(method="by_run", label="Id of a QC run; unless told, the latest of each well.")

    class Meta:
        model = Flag
        fields: list[str] = []

    def by_run(self, rows: QuerySet[Any], name: str, number: Any) -> QuerySet[Any]:
        return rows.filter(run=_an_id("run", number))

    def filter_queryset(self, queryset: QuerySet[Any]) -> QuerySet[Any]:
        rows = super().filter_queryset(queryset)
        return rows if self.form.cleaned_data.get("run") is not None else rows.in_force()


class UploadRows(Rows):
    paths = {"project": "project", "changed": "created_at"}
    state = OneOf(Upload.Outcome.values, field_name="outcome", label="How the upload ended.")

    class Meta:
        model = Upload
        fields: list[str] = []


class RuleSetRows(django_filters.FilterSet):
    project = django_filters.CharFilter(method="by_project", label="Slug of the project; the standard sets come too.")
    name = django_filters.CharFilter(field_name="name", label="Name of the rule set.")

    class Meta:
        model = RuleSet
        fields: list[str] = []

    def by_project(self, rows: QuerySet[Any], name: str, slug: str) -> QuerySet[Any]:
        return rows.filter(Q(project=None) | Q(project=caller_of(self.request).project(slug)))


class QcRunRows(RowsOfWells):
    paths = {"project": "project", "well": "wells", "changed": "started_at"}
    many = frozenset({"well"})

    class Meta:
        model = QcRun
        fields: list[str] = []


class DecisionRows(RowsOfSamples):
    paths = {
        "project": "review_set__project", "well": "review_set__well", "sample": "result__analysis__sample__",
        "method": "result__analysis__method__code", "analyte": "result__analyte__code", "changed": "decided_at",
    }  # fmt: skip
    verdict = OneOf(Verdict.values, field_name="verdict", label="Verdict of the decision.")
    state = OneOf(Verdict.values, field_name="verdict", label="The same as verdict.")
    review_set = django_filters.NumberFilter(method="by_review_set", label="Id of the review set.")

    class Meta:
        model = Decision
        fields: list[str] = []

    def by_review_set(self, rows: QuerySet[Any], name: str, number: Any) -> QuerySet[Any]:
        return rows.filter(review_set=_an_id("review_set", number))


class ReviewSetRows(RowsOfWells):
    paths = {"project": "project", "well": "well", "changed": "decisions__decided_at"}
    state = OneOf(ReviewSetState.values, field_name="state", label="State of the review set.")

    class Meta:
        model = ReviewSet
        fields: list[str] = []

    def by_change(self, rows: QuerySet[Any], name: str, moment: datetime) -> QuerySet[Any]:
        """Opened, decided in, signed or re-opened since."""
        decided = Exists(Decision.objects.filter(review_set=OuterRef("pk"), decided_at__gte=moment))
        touched = Q(signed_at__gte=moment) | Q(reopening__reopened_at__gte=moment)
        signed = Exists(SignOff.objects.filter(touched, review_set=OuterRef("pk")))
        return rows.filter(Q(created_at__gte=moment) | decided | signed)


class SignOffRows(RowsOfWells):
    paths = {"project": "review_set__project", "well": "review_set__well", "changed": "signed_at"}
    state = OneOf(["in_force", "reopened"], method="by_force", label="Whether the signature is in force.")

    class Meta:
        model = SignOff
        fields: list[str] = []

    def by_force(self, rows: QuerySet[Any], name: str, state: str) -> QuerySet[Any]:
        return rows.filter(reopening__isnull=state == "in_force")


class ReleaseRows(Rows):
    paths = {"project": "project"}
    state = OneOf(["valid", "withdrawn"], method="by_state", label="Whether the release was withdrawn.")

    class Meta:
        model = Release
        fields: list[str] = []

    def by_state(self, rows: QuerySet[Any], name: str, state: str) -> QuerySet[Any]:
        return rows.filter(withdrawn_at__isnull=state == "valid")

    def by_change(self, rows: QuerySet[Any], name: str, moment: datetime) -> QuerySet[Any]:
        return rows.filter(Q(created_at__gte=moment) | Q(withdrawn_at__gte=moment))


class AuditRows(Rows):
    paths = {"project": "project", "changed": "at"}
    action = django_filters.CharFilter(field_name="action", label="What was done, such as release.made.")
    actor = django_filters.CharFilter(field_name="actor_name", label="Who did it.")

    class Meta:
        model = AuditEntry
        fields: list[str] = []

    def by_project(self, rows: QuerySet[Any], name: str, slug: str) -> QuerySet[Any]:
        project = self.caller.project(slug)
        self.caller.require(project, Action.READ_AUDIT)
        return rows.filter(project=project)
