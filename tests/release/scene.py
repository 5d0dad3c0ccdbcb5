"""A small project for release and API tests, made through the models: two wells, pyrolysis and carbon."""

from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass, field

from django.contrib.auth.models import User
from django.db import transaction

from labdata.models import (
    Analysis,
    Analyte,
    Job,
    Method,
    Project,
    Release,
    Report,
    Result,
    Role,
    Sample,
    SampleKind,
    SourceColumn,
    SourceFile,
    SourceTable,
    Well,
)
from labdata.release.services import prepare_release, request_release
from qc.models import ReviewItem, ReviewSet, SignOff, Verdict
from qc.review.services import Choice, decide, sign_off
from qc.review.standing import results_of
from tests.factories import PASSWORD, LaboratoryFactory, MembershipFactory, ProjectFactory, WellFactory

ANALYTES = {
    "TOC": ("wt%", "carbon", []), "S1": ("mg/g", "pyrolysis", []), "S2": ("mg/g", "pyrolysis", []),
    "TMAX": ("degC", "pyrolysis", []), "HI": ("mg/g TOC", "pyrolysis", ["S2", "TOC"]),
}  # fmt: skip


def analytes() -> dict[str, Analyte]:
    """The analytes as the catalogue has them, or made here."""
    held = {analyte.code: analyte for analyte in Analyte.objects.filter(project=None, code__in=ANALYTES)}
    for order, (code, (unit, method, inputs)) in enumerate(ANALYTES.items()):
        if code not in held:
            owner, _ = Method.objects.get_or_create(code=method, defaults={"name": method})
            held[code] = Analyte.objects.create(
                code=code, name=code, unit=unit, method=owner, inputs=inputs, order=order
            )  # fmt: skip
    return held


@dataclass
class Scene:
    """A project and its people, one a role."""

    project: Project
    people: dict[str, User]
    sets: list[ReviewSet] = field(default_factory=list)
    files: int = 0
    methods: dict[str, Method] = field(default_factory=dict)
    columns: dict[tuple[int, int], SourceColumn] = field(default_factory=dict)
    analytes: dict[str, Analyte] = field(default_factory=dict)

    def person(self, role: str) -> User:
        return self.people[role]

    def table(self, orientation: str = "rows", version: int = 1, number: str = "") -> SourceTable:
        """A report with one table."""
        self.files += 1
        sha256 = f"{self.project.pk:032x}{self.files:032x}"
        source = SourceFile.objects.create(
            project=self.project, sha256=sha256, name=f"file {self.files}.xlsx", size=1, stored_as=f"files/{sha256}"
        )
        report = Report.objects.create(
            project=self.project, source_file=source, number=number or f"R-{self.files}", version=version,
            laboratory=LaboratoryFactory(project=self.project),
        )  # fmt: skip
        return SourceTable.objects.create(
            report=report, sheet="Sheet1", cell_range="A1:Z99", kind="pyrolysis", orientation=orientation
        )

    def well(self, name: str, **more) -> tuple[Well, ReviewSet]:
        well = WellFactory(project=self.project, name=name, name_key=name.casefold(), **more)
        held = ReviewSet.objects.create(project=self.project, well=well, number=1)
        self.sets.append(held)
        return well, held

    def sample(self, well: Well, top: float, label: str = "", **more) -> Sample:
        return Sample.objects.create(
            well=well, kind=SampleKind.CUTTINGS, label=label, match_key=f"cuttings|{label}|{top:.3f}|{top + 5:.3f}",
            top_md_m=top, base_md_m=top + 5, top_reported=f"{top:g}", base_reported=f"{top + 5:g}",
            depth_unit_reported="m", **more,
        )  # fmt: skip

    def analysis(
        self,
        held: ReviewSet,
        at: tuple[SourceTable, int],
        sample: Sample,
        method: str,
        values: dict,
        *,
        replicate: int = 1,
    ) -> Analysis:
        """One analysis with its results; ``values``: analyte -> number, or text with a qualifier ("<0.05")."""
        table, line = at
        made = Analysis.objects.create(
            project=self.project, sample=sample, method=self.method(method), report=table.report, table=table,
            line=line, laboratory=table.report.laboratory, replicate=replicate,
        )  # fmt: skip
        Result.objects.bulk_create(
            self._result(made, code, str(given), self.column(table, code, method)) for code, given in values.items()
        )
        ReviewItem.objects.create(review_set=held, analysis=made)
        return made

    def method(self, code: str) -> Method:
        if code not in self.methods:
            self.methods[code], _ = Method.objects.get_or_create(code=code, defaults={"name": code})
        return self.methods[code]

    def column(self, table: SourceTable, code: str, method: str) -> SourceColumn:
        line = list(ANALYTES).index(code) + 4 + 10 * (method == "carbon")
        if (table.pk, line) not in self.columns:
            self.columns[table.pk, line] = SourceColumn.objects.create(
                table=table, line=line, header=code, field=code, unit_reported=ANALYTES[code][0]
            )
        return self.columns[table.pk, line]

    def _result(self, made: Analysis, code: str, text: str, column: SourceColumn) -> Result:
        self.analytes = self.analytes or analytes()
        number = text.lstrip("<>~")
        return Result(
            analysis=made, analyte=self.analytes[code], column=column, qualifier=text[0] if text[0] in "<>~" else "",
            value_reported=text, value=float(number) if number else None,
        )  # fmt: skip

    def accept(self, held: ReviewSet, rejected: dict[int, str] | None = None) -> None:
        """Accept everything in the set but ``rejected`` (result id -> reason)."""
        turned_down = rejected or {}
        choices = [
            Choice(pk, Verdict.REJECTED, turned_down[pk]) if pk in turned_down else Choice(pk, Verdict.ACCEPTED)
            for pk in results_of(held).values_list("pk", flat=True)
        ]
        decide(user=self.person("geochemist"), review_set=held, choices=choices)

    def sign(self, held: ReviewSet) -> SignOff:
        held.refresh_from_db()
        return sign_off(user=self.person("approver"), review_set=held, password=PASSWORD, meaning="reviewed")

    def result(self, analysis: Analysis, code: str) -> Result:
        return analysis.results.get(analyte__code=code)


def bare_scene() -> Scene:
    """A project with one member a role and nothing measured."""
    project = ProjectFactory()
    people = {role.value: MembershipFactory(project=project, role=role).user for role in Role}
    return Scene(project, people)


def small_scene() -> Scene:
    """Two wells with three samples each, undecided: S2 and HI in pyrolysis, TOC apart, one value below a limit."""
    scene = bare_scene()
    for name in ("Quill 1", "Quill 2"):
        well, held = scene.well(name, uwi=f"UWI-{name[-1]}-{scene.project.pk}")
        table = scene.table()
        for number in range(3):
            sample = scene.sample(well, 2000.0 + 10 * number, f"S-{number}", formation="Upper Shale" if number else "")
            values = {"S1": "<0.05" if number == 0 else 0.5 + number, "S2": 5.0 + number, "TMAX": 431.0, "HI": 250.5}
            scene.analysis(held, (table, 5 + number), sample, "pyrolysis", values)
            scene.analysis(held, (table, 5 + number), sample, "carbon", {"TOC": 2.125})
    return scene


def signed_scene() -> Scene:
    """The small scene, with S2 of the first sample of the first well rejected, both wells signed."""
    scene = small_scene()
    first = scene.sets[0].analyses.filter(method__code="pyrolysis").order_by("pk")[0]
    scene.accept(scene.sets[0], {scene.result(first, "S2").pk: "contamination"})
    scene.accept(scene.sets[1])
    for held in scene.sets:
        scene.sign(held)
    return scene


class HandContext:
    """A job run by hand, inside the test's own transaction."""

    def __init__(self, job: Job) -> None:
        self.job = job

    def tick(self, *args, **kwargs) -> None:
        pass

    def step(self, note: str, allow: float = 0) -> AbstractContextManager:
        return nullcontext()


def release_of(scene: Scene, title: str = "First look") -> Release:
    """A release made by the job's own handler, without a worker."""
    job = request_release(project=scene.project, user=scene.person("approver"), title=title)
    commit = prepare_release(HandContext(job))
    with transaction.atomic():
        made = commit()
    return Release.objects.get(pk=made["release"])
