"""Finding the results that a row of a table speaks of, by the names people use."""

from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from labdata.models import Analysis, Project, Result, Sample
from qc.models import ReviewSet


class Unclear(Exception):
    """A cell that does not name exactly one thing: which column, what was found, what would do."""

    def __init__(self, column: str, message: str, remedy: str) -> None:
        super().__init__(message)
        self.column, self.message, self.remedy = column, message, remedy


@dataclass
class Run:
    """One analysis of a sample and its current results by analyte code."""

    analysis: int
    replicate: int
    results: dict[str, int] = field(default_factory=dict)


class Finder:
    """All current results of a project, looked up by sample, method, replicate and analyte.

    Read once (two queries), so that a long table costs no query a row.
    """

    def __init__(self, project: Project) -> None:
        self.samples = list(
            Sample.objects.filter(well__project=project).values_list("pk", "label", "well__name", "top_md_m")
        )
        self.by_label: dict[str, list[int]] = defaultdict(list)
        self.where: dict[int, tuple[str, str]] = {}
        for pk, label, well, top in self.samples:
            self.by_label[label.casefold()].append(pk)
            self.where[pk] = (well, "" if top is None else f" at {top:g} m")
        self.runs: dict[int, dict[str, list[Run]]] = defaultdict(lambda: defaultdict(list))
        self.sets: dict[int, ReviewSet] = {}
        self._read(project)

    def _read(self, project: Project) -> None:
        results = Result.objects.filter(current=True, analysis__current=True, analysis__project=project)
        rows = results.filter(analysis__sample__isnull=False).order_by("analysis__replicate", "analysis", "pk")
        runs: dict[int, Run] = {}
        names = ("pk", "analyte__code", "analysis", "analysis__replicate", "analysis__method__code", "analysis__sample")
        for pk, code, analysis, replicate, method, sample in rows.values_list(*names):
            if analysis not in runs:
                runs[analysis] = Run(analysis, replicate)
                self.runs[sample][method].append(runs[analysis])
            runs[analysis].results[code] = pk
        held = Analysis.objects.filter(pk__in=results.values("analysis"), review_item__isnull=False)
        sets = ReviewSet.objects.filter(project=project).select_related("well", "project").in_bulk()
        self.sets = {analysis: sets[number] for analysis, number in held.values_list("pk", "review_item__review_set")}

    def results(self, cells: Mapping[str, str]) -> tuple[ReviewSet, list[int]]:
        """The review set and the results that a row names: one analyte, or the whole analysis. Raises Unclear."""
        sample = self._sample(cells.get("sample", ""), cells.get("well", ""))
        run = self._run(sample, cells.get("method", ""), cells.get("replicate", ""))
        if run.analysis not in self.sets:
            raise Unclear("sample", "is in no review set", "Results are reviewed once their report has landed.")
        code = cells.get("analyte", "").upper()
        if not code:
            return self.sets[run.analysis], list(run.results.values())
        if code not in run.results:
            raise Unclear(
                "analyte", f"«{cells['analyte']}» was not measured in this analysis", f"It has {_listed(run.results)}."
            )
        return self.sets[run.analysis], [run.results[code]]

    def _sample(self, name: str, well: str) -> int:
        """A sample by its label, or, where no label fits, by its number."""
        if not name:
            raise Unclear("sample", "names no sample", "Give the sample's label, or its number.")
        found = list(self.by_label.get(name.casefold(), ()))
        if not found and name.isdigit() and int(name) in self.where:
            found = [int(name)]
        if not found:
            raise Unclear("sample", f"there is no sample «{name}» in the project", "Give the label as reported.")
        if well:
            found = [pk for pk in found if self.where[pk][0].casefold() == well.casefold()]
        if not found:
            raise Unclear("well", f"well «{well}» has no sample «{name}»", "Check the well's name.")
        if len(found) > 1:
            raise self._ambiguous(name, found)
        return found[0]

    def _ambiguous(self, name: str, found: list[int]) -> Unclear:
        wells = {self.where[pk][0] for pk in found}
        places = ", ".join(f"{pk}: {self.where[pk][0]}{self.where[pk][1]}" for pk in found[:6])
        remedy = (
            "Name the well in a column «well»." if len(wells) == len(found) else "Give the sample's number instead."
        )
        return Unclear("sample", f"«{name}» names {len(found)} samples ({places})", remedy)

    def _run(self, sample: int, method: str, replicate: str) -> Run:
        """One analysis of the sample: by method and, where there are several, replicate."""
        methods = self.runs.get(sample, {})
        runs = methods.get(method.casefold(), [])
        if not runs:
            said = f"«{method}» is no method of this sample" if method else "names no method"
            raise Unclear("method", said, f"It has {_listed(methods)}." if methods else "It has no current results.")
        if not replicate:
            if len(runs) > 1:
                raise Unclear(
                    "replicate",
                    f"the sample was run {len(runs)} times",
                    f"Replicates: {_listed(r.replicate for r in runs)}.",
                )
            return runs[0]
        for run in runs:
            if replicate == str(run.replicate):
                return run
        raise Unclear(
            "replicate", f"there is no replicate «{replicate}»", f"Replicates: {_listed(r.replicate for r in runs)}."
        )


def _listed(things: Iterable[object]) -> str:
    return ", ".join(map(str, things))
