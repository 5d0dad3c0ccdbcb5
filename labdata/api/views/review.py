"""Review sets, decisions and signatures."""

from collections import defaultdict
from typing import Any, cast

from django.db import transaction
from django.db.models import Count, QuerySet
from drf_spectacular.utils import extend_schema
from rest_framework import serializers as fields
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.access import Action
from labdata.api import filters, serializers
from labdata.api.base import Body, ListAndDetailView, checked
from labdata.api.idempotency import once
from labdata.api.schema import IDEMPOTENCY_KEY
from labdata.models import Result
from qc.models import Decision, ReasonCode, ReviewSet, SignOff, Verdict
from qc.review.choices import reason_of
from qc.review.services import Choice, decide, sign_off

BATCH_LIMIT = 50_000
AN_ID: dict[str, Any] = {"min_value": 1, "max_value": 10**18}


@extend_schema(tags=["review"])
class ReviewSets(ListAndDetailView):
    """The analyses of a well that are reviewed and signed together."""

    rows = ReviewSet.objects.select_related("project", "well").annotate(analysis_count=Count("items"))
    serializer_class = serializers.ReviewSetOut
    filterset_class = filters.ReviewSetRows

    def get_serializer_class(self) -> type[fields.BaseSerializer[Any]]:
        return serializers.ReviewSetDetailOut if self.action == "retrieve" else serializers.ReviewSetOut


class ChoiceBody(Body):
    """A verdict on one result, or on every result of an analysis."""

    result = fields.IntegerField(required=False, **AN_ID)
    analysis = fields.IntegerField(required=False, **AN_ID)
    verdict = fields.ChoiceField(choices=Verdict.values)
    reason = fields.CharField(
        required=False,
        default="",
        allow_blank=True,
        max_length=2000,
        help_text=f"one of {', '.join(filter(None, ReasonCode.values))}; any other words count as «other» with this text",
    )
    text = fields.CharField(required=False, default="", allow_blank=True, max_length=2000)

    def validate(self, attrs: dict[str, Any]) -> dict[str, Any]:
        if ("result" in attrs) == ("analysis" in attrs):
            raise fields.ValidationError("Name either a result or an analysis.")
        return attrs


class DecisionsBody(Body):
    review_set = fields.IntegerField(required=False, help_text="unless told, the sets of the results", **AN_ID)
    expected_version = fields.IntegerField(
        required=False, min_value=0, max_value=2**31 - 1, help_text="version of the review set that was looked at"
    )
    decisions = fields.ListField(child=ChoiceBody(), min_length=1, max_length=BATCH_LIMIT)

    def validate(self, attrs: dict[str, Any]) -> dict[str, Any]:
        if "expected_version" in attrs and "review_set" not in attrs:
            raise fields.ValidationError({"expected_version": ["A version is of one set: name the review_set too."]})
        return attrs


class BatchOut(fields.Serializer[Any]):
    review_set = fields.IntegerField()
    batch = fields.UUIDField()
    decisions = fields.IntegerField(help_text="how many")
    version = fields.IntegerField(help_text="of the review set, after")


class BatchesOut(fields.Serializer[Any]):
    batches = BatchOut(many=True)


@extend_schema(tags=["review"])
class Decisions(ListAndDetailView):
    """Who decided what on which value, and why; the latest stands."""

    rows = Decision.objects.select_related(
        "review_set__project", "review_set__well", "result__analysis__sample", "result__analysis__method",
        "result__analyte", "decided_by",
    )  # fmt: skip
    project_path = "review_set__project"
    serializer_class = serializers.DecisionOut
    filterset_class = filters.DecisionRows

    @extend_schema(request=DecisionsBody, responses={201: BatchesOut}, parameters=[IDEMPOTENCY_KEY])
    @once
    def create(self, request: Request) -> Response:
        """Decide on results, all or none. One batch a review set."""
        self.caller.permitted(Action.DECIDE)
        data = checked(DecisionsBody, request)
        chosen = self._by_set(data["decisions"], data.get("review_set"))
        with transaction.atomic():
            made = [self._decide(pk, choices, data.get("expected_version")) for pk, choices in sorted(chosen.items())]
        return Response({"batches": made}, status=201)

    def _decide(self, pk: int, choices: list[Choice], expected_version: int | None) -> dict[str, Any]:
        review_set = self.caller.find(ReviewSet.objects.select_related("project", "well"), pk, "review set")
        batch = decide(user=self.caller.user, review_set=review_set, choices=choices, expected_version=expected_version)
        review_set.refresh_from_db()
        return {"review_set": pk, "batch": str(batch), "decisions": len(choices), "version": review_set.version}

    def _by_set(self, wanted: list[dict[str, Any]], only: int | None) -> dict[int, list[Choice]]:
        """The choices by review set. Raises ValidationError naming what is not there or is of another set."""
        members = self._members(wanted)
        chosen: dict[int, list[Choice]] = defaultdict(list)
        errors: dict[int, Any] = {}
        for number, choice in enumerate(wanted):
            kind = "result" if "result" in choice else "analysis"
            found = members[kind].get(choice[kind], [])
            held = {review_set for review_set, _ in found}
            if not found:
                errors[number] = {kind: [f"There is no {kind} {choice[kind]} under review."]}
            elif only is not None and held != {only}:
                errors[number] = {kind: [f"The {kind} {choice[kind]} is in review set {min(held)}, not {only}."]}
            for review_set, result in found:
                reason, text = reason_of(choice["reason"], choice["text"])
                chosen[review_set].append(Choice(result, choice["verdict"], reason, text))
        if errors:
            raise fields.ValidationError({"decisions": cast(Any, errors)})
        return chosen

    def _members(self, wanted: list[dict[str, Any]]) -> dict[str, dict[int, list[tuple[int, int]]]]:
        """(review set, result) of every result and analysis named, as far as the caller may see them."""
        current = Result.objects.filter(current=True, analysis__current=True, analysis__review_item__isnull=False)
        rows: QuerySet[Result] = self.caller.visible(current, "analysis__project")
        members: dict[str, dict[int, list[tuple[int, int]]]] = {
            "result": defaultdict(list),
            "analysis": defaultdict(list),
        }
        for kind, path in (("result", "pk"), ("analysis", "analysis_id")):
            ids = sorted({choice[kind] for choice in wanted if kind in choice})
            for start in range(0, len(ids), 500):
                some = rows.filter(**{f"{path}__in": ids[start : start + 500]})
                for key, held, pk in some.values_list(path, "analysis__review_item__review_set_id", "pk"):
                    members[kind][key].append((held, pk))
        return members


class SignOffBody(Body):
    review_set = fields.IntegerField(**AN_ID)
    password = fields.CharField(
        trim_whitespace=False, max_length=1000, write_only=True, help_text="the signer's own, again"
    )
    meaning = fields.CharField(max_length=300, help_text="what the signature means, in words")
    expected_version = fields.IntegerField(required=False, min_value=0, max_value=2**31 - 1)


@extend_schema(tags=["review"])
class SignOffs(ListAndDetailView):
    """Signatures over review sets, in force and re-opened."""

    rows = SignOff.objects.select_related("review_set__project", "review_set__well", "signed_by", "reopening")
    project_path = "review_set__project"
    serializer_class = serializers.SignOffOut
    filterset_class = filters.SignOffRows

    @extend_schema(request=SignOffBody, responses={201: serializers.SignOffOut}, parameters=[IDEMPOTENCY_KEY])
    @once
    def create(self, request: Request) -> Response:
        """Sign a review set as somebody who decided nothing in it, with the password again."""
        self.caller.permitted(Action.SIGN)
        data = checked(SignOffBody, request)
        sets = ReviewSet.objects.select_related("project", "well")
        review_set = self.caller.find(sets, data.pop("review_set"), "review set")
        made = sign_off(user=self.caller.user, review_set=review_set, **data)
        return Response(serializers.SignOffOut(self.rows.get(pk=made.pk)).data, status=201)
