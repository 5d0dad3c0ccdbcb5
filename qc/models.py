"""QC runs and flags; review sets, decisions and signatures."""

import uuid

from django.conf import settings
from django.db import models
from django.utils import timezone

from labdata.models.analyses import Analysis, Result
from labdata.models.base import Choices
from labdata.models.jobs import Job
from labdata.models.projects import Project
from labdata.models.wells import Well


class RuleSet(models.Model):
    """A named, versioned set of thresholds. ``project`` is empty for the one every project starts with.

    ``thresholds``: rule -> parameter -> {value, unit, source, mark}; ``disabled``: rules switched off.
    """

    project = models.ForeignKey(Project, on_delete=models.CASCADE, null=True, blank=True, related_name="rule_sets")
    name = models.CharField(max_length=80)
    version = models.PositiveIntegerField()
    thresholds = models.JSONField()
    disabled = models.JSONField(default=list, blank=True)
    author = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)
    reason = models.TextField()
    created_at = models.DateTimeField(default=timezone.now, editable=False)

    class Meta:
        ordering = ["project", "name", "-version"]
        constraints = [
            models.UniqueConstraint(fields=["project", "name", "version"], name="rule_set_version_once"),
            models.UniqueConstraint(
                fields=["name", "version"], condition=models.Q(project__isnull=True), name="rule_set_default_once"
            ),
        ]

    def __str__(self) -> str:
        return f"{self.name} {self.version}"


class QcRun(models.Model):
    """One run of a rule set over wells of a project. ``summary``: rule -> counts of the four outcomes."""

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="qc_runs")
    rule_set = models.ForeignKey(RuleSet, on_delete=models.PROTECT, related_name="runs")
    job = models.ForeignKey(Job, on_delete=models.SET_NULL, null=True, blank=True, related_name="qc_runs")
    started_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)
    started_at = models.DateTimeField(default=timezone.now)
    seconds = models.FloatField(default=0.0)
    analyses_checked = models.PositiveIntegerField(default=0)
    results_checked = models.PositiveIntegerField(default=0)
    summary = models.JSONField(default=list)
    wells: "models.ManyToManyField[Well, QcRunWell]" = models.ManyToManyField(
        Well, through="QcRunWell", related_name="qc_runs"
    )

    class Meta:
        ordering = ["-id"]

    def __str__(self) -> str:
        return f"QC run {self.pk}"


class QcRunWell(models.Model):
    """A well covered by a run. The flags that count for a well are those of its latest run."""

    run = models.ForeignKey(QcRun, on_delete=models.CASCADE)
    well = models.ForeignKey(Well, on_delete=models.CASCADE)

    class Meta:
        constraints = [models.UniqueConstraint(fields=["run", "well"], name="qc_run_well_once")]
        indexes = [models.Index(fields=["well", "-run"], name="qc_run_latest")]

    def __str__(self) -> str:
        return f"{self.run} {self.well}"


class Severity(Choices):
    """A suggestion to a human; no rule rejects anything."""

    INFO = "info", "for information"
    WARN = "warn", "look before signing"
    REJECT_CANDIDATE = "reject-candidate", "candidate for rejection"


class FlagQuerySet(models.QuerySet["Flag"]):
    def in_force(self) -> "FlagQuerySet":
        """Flags of the latest run of each well."""
        newest = QcRunWell.objects.filter(well=models.OuterRef("well")).order_by("-run").values("run")[:1]
        return self.filter(run=models.Subquery(newest))


class Flag(models.Model):
    """One firing of one rule, with its evidence.

    ``result`` is the value the flag speaks of, when it speaks of one; ``analyte`` its code.
    ``fingerprint`` is the same for the same rule, inputs and thresholds in every run, so that an answer to a
    flag outlives the run.
    """

    run = models.ForeignKey(QcRun, on_delete=models.CASCADE, related_name="flags")
    well = models.ForeignKey(Well, on_delete=models.CASCADE, related_name="flags")
    analysis = models.ForeignKey(Analysis, on_delete=models.CASCADE, null=True, blank=True, related_name="flags")
    result = models.ForeignKey(Result, on_delete=models.CASCADE, null=True, blank=True, related_name="flags")
    rule = models.CharField(max_length=40)
    family = models.CharField(max_length=20)
    severity = models.CharField(max_length=16, choices=Severity.choices)
    analyte = models.CharField(max_length=24, blank=True)
    value = models.FloatField(null=True, blank=True)
    message = models.TextField()
    evidence = models.JSONField(default=dict)
    source = models.TextField()
    fingerprint = models.CharField(max_length=64)

    objects = FlagQuerySet.as_manager()

    class Meta:
        ordering = ["id"]
        constraints = [
            Severity.constraint("severity", "flag_severity_known"),
            models.CheckConstraint(condition=~models.Q(source=""), name="flag_has_source"),
        ]
        indexes = [models.Index(fields=["well", "rule"], name="flag_by_well_rule")]

    def __str__(self) -> str:
        return f"{self.rule} {self.message}"


class ReviewSetState(Choices):
    OPEN = "open", "in review"
    SIGNED = "signed", "signed"


class ReviewSet(models.Model):
    """The analyses of one well that are reviewed and signed together.

    New results of a well join its open set; when the last one is signed, a further set is opened. A later
    version of a report that changes values puts them into the set of the values they supersede.
    """

    project = models.ForeignKey(Project, on_delete=models.PROTECT, related_name="review_sets")
    well = models.ForeignKey(Well, on_delete=models.PROTECT, related_name="review_sets")
    number = models.PositiveSmallIntegerField()
    state = models.CharField(max_length=6, choices=ReviewSetState.choices, default=ReviewSetState.OPEN)
    version = models.PositiveIntegerField(default=1, help_text="rises with every decision, for optimistic locking")
    created_at = models.DateTimeField(default=timezone.now, editable=False)
    analyses: "models.ManyToManyField[Analysis, ReviewItem]" = models.ManyToManyField(
        Analysis, through="ReviewItem", related_name="review_sets"
    )

    class Meta:
        ordering = ["project", "well", "number"]
        constraints = [
            models.UniqueConstraint(fields=["well", "number"], name="review_set_number_once"),
            ReviewSetState.constraint("state", "review_set_state_known"),
        ]

    def __str__(self) -> str:
        return f"{self.well} set {self.number}"


class ReviewItem(models.Model):
    """An analysis belongs to exactly one review set."""

    review_set = models.ForeignKey(ReviewSet, on_delete=models.PROTECT, related_name="items")
    analysis = models.OneToOneField(Analysis, on_delete=models.PROTECT, related_name="review_item")

    def __str__(self) -> str:
        return f"{self.review_set}: {self.analysis}"


class Verdict(Choices):
    """What a person decided; no decision yet is "undecided"."""

    ACCEPTED = "accepted", "accepted"
    REJECTED = "rejected", "rejected"
    HELD = "held", "held"
    UNDECIDED = "undecided", "undecided"


class ReasonCode(Choices):
    """The short list of reasons. A rejection or a hold needs one; "other" needs text."""

    NONE = "", "no reason needed"
    CONTAMINATION = "contamination", "contaminated"
    SUPPRESSION = "suppression", "suppressed or matrix effect"
    DEPTH = "depth", "wrong depth or wrong sample"
    MEASUREMENT = "measurement", "measurement fault"
    MISKEYED = "miskeyed", "slip in the report"
    LOW_SIGNAL = "low_signal", "signal too small"
    REPEAT_ASKED = "repeat_asked", "repeat asked from the laboratory"
    GEOLOGY = "geology", "explained by the geology"
    OTHER = "other", "other (say which)"


class Decision(models.Model):
    """One person's verdict on one result. Append-only; the latest stands (highest id).

    ``batch`` joins the decisions of one gesture. ``carried_from`` is set where a later report version left the
    value unchanged and the standing decision was carried over.
    """

    review_set = models.ForeignKey(ReviewSet, on_delete=models.PROTECT, related_name="decisions")
    result = models.ForeignKey(Result, on_delete=models.PROTECT, related_name="decisions")
    verdict = models.CharField(max_length=10, choices=Verdict.choices)
    reason = models.CharField(max_length=20, choices=ReasonCode.choices, blank=True)
    text = models.TextField(blank=True)
    decided_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, related_name="decisions")
    decided_at = models.DateTimeField(default=timezone.now)
    batch = models.UUIDField(default=uuid.uuid4)
    carried_from = models.ForeignKey("self", on_delete=models.PROTECT, null=True, blank=True, related_name="+")

    class Meta:
        ordering = ["id"]
        constraints = [
            Verdict.constraint("verdict", "decision_verdict_known"),
            ReasonCode.constraint("reason", "decision_reason_known"),
            models.CheckConstraint(
                condition=~models.Q(verdict__in=["rejected", "held"]) | ~models.Q(reason=""),
                name="decision_says_why",
            ),
            models.CheckConstraint(
                condition=~models.Q(reason="other") | ~models.Q(text=""), name="decision_other_has_text"
            ),
        ]
        indexes = [models.Index(fields=["result", "-id"], name="decision_latest")]

    def __str__(self) -> str:
        return f"{self.result} {self.verdict}"


class FlagAnswer(models.Model):
    """A reviewer agreed with a flag or dismissed it. Append-only; the latest stands."""

    class Answer(Choices):
        AGREED = "agreed", "agreed"
        DISMISSED = "dismissed", "dismissed"

    review_set = models.ForeignKey(ReviewSet, on_delete=models.PROTECT, related_name="flag_answers")
    fingerprint = models.CharField(max_length=64, db_index=True)
    rule = models.CharField(max_length=40)
    answer = models.CharField(max_length=10, choices=Answer.choices)
    reason = models.TextField()
    answered_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, related_name="+")
    answered_at = models.DateTimeField(default=timezone.now)

    class Meta:
        ordering = ["id"]
        constraints = [models.CheckConstraint(condition=~models.Q(reason=""), name="flag_answer_says_why")]

    def __str__(self) -> str:
        return f"{self.rule} {self.answer}"


class NoteKind(Choices):
    NOTE = "note", "note"
    QUESTION = "question", "question to the laboratory"
    ANSWER = "answer", "answer of the laboratory"


class Note(models.Model):
    """A word in the thread of a result or a flag: a note, a question to the laboratory, or its answer. Append-only.

    A flag is named by rule and fingerprint, so that its thread outlives the run; where the flag speaks of one result,
    ``result`` is that one. A question is open until an answer points to it.
    """

    review_set = models.ForeignKey(ReviewSet, on_delete=models.PROTECT, related_name="notes")
    result = models.ForeignKey(Result, on_delete=models.PROTECT, null=True, blank=True, related_name="notes")
    rule = models.CharField(max_length=40, blank=True)
    fingerprint = models.CharField(max_length=64, blank=True, db_index=True)
    kind = models.CharField(max_length=8, choices=NoteKind.choices, default=NoteKind.NOTE)
    answers = models.ForeignKey("self", on_delete=models.PROTECT, null=True, blank=True, related_name="answered_by")
    text = models.TextField()
    written_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, related_name="+")
    written_at = models.DateTimeField(default=timezone.now)

    class Meta:
        ordering = ["id"]
        constraints = [
            NoteKind.constraint("kind", "note_kind_known"),
            models.CheckConstraint(condition=~models.Q(text=""), name="note_says_something"),
            models.CheckConstraint(
                condition=models.Q(result__isnull=False) | ~models.Q(fingerprint=""), name="note_is_about_something"
            ),
            models.CheckConstraint(
                condition=models.Q(kind="answer", answers__isnull=False)
                | (~models.Q(kind="answer") & models.Q(answers=None)),
                name="note_answer_answers",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.kind} {self.pk}"


class SignOff(models.Model):
    """A second person's signature over exactly what was seen. Append-only.

    ``content_sha256`` is over the canonical text of the set's results and decisions (qc/review/seal.py).
    """

    review_set = models.ForeignKey(ReviewSet, on_delete=models.PROTECT, related_name="sign_offs")
    signed_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, related_name="sign_offs")
    signer_name = models.CharField(max_length=150)
    signed_at = models.DateTimeField(default=timezone.now)
    meaning = models.CharField(max_length=300)
    content_sha256 = models.CharField(max_length=64)
    counts = models.JSONField()
    qc_run = models.ForeignKey(QcRun, on_delete=models.PROTECT, null=True, blank=True, related_name="+")

    class Meta:
        ordering = ["id"]
        constraints = [models.CheckConstraint(condition=~models.Q(meaning=""), name="sign_off_states_meaning")]

    def __str__(self) -> str:
        return f"{self.review_set} signed by {self.signer_name}"


class Reopening(models.Model):
    """A signature lost its force: a person re-opened the set, or a signed value changed. Append-only."""

    sign_off = models.OneToOneField(SignOff, on_delete=models.PROTECT, related_name="reopening")
    reopened_by = models.ForeignKey(settings.AUTH_USER_MODEL, on_delete=models.PROTECT, null=True, blank=True)
    reopened_at = models.DateTimeField(default=timezone.now)
    reason = models.TextField()

    class Meta:
        constraints = [models.CheckConstraint(condition=~models.Q(reason=""), name="reopening_says_why")]

    def __str__(self) -> str:
        return f"{self.sign_off} re-opened"
