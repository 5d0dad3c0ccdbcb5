"""An invented well for the review tests: pyrolysis with depth, a stained interval, a few odd cells."""

import random
from itertools import count

from labdata.models import (
    Analysis,
    Analyte,
    CasingShoe,
    CoreRun,
    FormationTop,
    Method,
    MudInterval,
    Project,
    Report,
    Result,
    Role,
    Sample,
    SourceColumn,
    SourceFile,
    SourceTable,
    Well,
)  # fmt: skip
from qc.models import Flag, QcRun, ReviewItem, ReviewSet, RuleSet
from tests.factories import MembershipFactory, ProjectFactory, UserFactory

UNITS = {
    "TOC": "wt%", "S1": "mg/g", "S2": "mg/g", "S3": "mg/g", "TMAX": "degC", "HI": "mg/g TOC", "OI": "mg/g TOC",
    "PI": "fraction", "RO": "%",
}  # fmt: skip
DECIMALS = {"TMAX": 0, "HI": 0, "OI": 0}
_number = count(1)


def person(project: Project, role: str, name: str = "", **fields):
    user = UserFactory(**({"username": name} if name else {}), **fields)
    MembershipFactory(project=project, user=user, role=role)
    return user


def people(project: Project):
    """A geochemist and an approver of the project."""
    return person(project, Role.GEOCHEMIST), person(project, Role.APPROVER)


def analyte(code: str) -> Analyte:
    method, _ = Method.objects.get_or_create(code="pyrolysis", defaults={"name": "Pyrolysis"})
    if code == "RO":
        method, _ = Method.objects.get_or_create(code="reflectance", defaults={"name": "Vitrinite reflectance"})
    fields = {"name": code, "unit": UNITS[code], "method": method, "decimals": DECIMALS.get(code, 2)}
    return Analyte.objects.get_or_create(code=code, project=None, defaults=fields)[0]


def report(project: Project, version: int = 1, supersedes: Report | None = None) -> Report:
    n = next(_number)
    source = SourceFile.objects.create(project=project, sha256=f"{n:064x}", name=f"R{n}.csv", size=1, stored_as=f"{n}")
    number = supersedes.number if supersedes else f"R-{n}"
    return Report.objects.create(
        project=project, source_file=source, number=number, version=version, supersedes=supersedes
    )


def table(of: Report, codes) -> tuple[SourceTable, dict[str, SourceColumn]]:
    made = SourceTable.objects.create(report=of, sheet="Data", cell_range="A1:Z200", kind="pyrolysis")
    columns = {
        code: SourceColumn.objects.create(
            table=made, line=line, header=code, field=code, unit_reported=UNITS[code], decimals=DECIMALS.get(code, 2)
        )
        for line, code in enumerate(codes, start=4)
    }
    return made, columns


def results(sample: Sample, of: SourceTable, columns, line: int, values: dict, *, replicate: int = 1) -> Analysis:
    """An analysis with its results; a value is a number, or text such as "<0.05"."""
    made = Analysis.objects.create(
        project=sample.well.project, sample=sample, method=Method.objects.get(code="pyrolysis"), report=of.report,
        table=of, line=line, replicate=replicate,
    )  # fmt: skip
    rows = []
    for code, value in values.items():
        text = value if isinstance(value, str) else f"{value:.{DECIMALS.get(code, 2)}f}"
        qualifier = text[0] if text[0] in "<>~" else ""
        rows.append(Result(
            analysis=made, analyte=analyte(code), column=columns[code], value=float(text.lstrip("<>~")),
            qualifier=qualifier, value_reported=text, decimals=DECIMALS.get(code, 2),
        ))  # fmt: skip
    Result.objects.bulk_create(rows)
    return made


def well(project: Project, name: str) -> Well:
    return Well.objects.create(project=project, name=name, name_key=name.casefold(), td_md_m=3200)


def small_set(project: Project | None = None, samples: int = 3, codes=("TOC", "S1", "S2", "TMAX")) -> ReviewSet:
    """A set of a few samples: label A-1, A-2, … at 2000, 2010, … m."""
    project = project or ProjectFactory()
    home = well(project, f"Ambry {next(_number)}")
    return fill(home, samples, codes)


def fill(home: Well, samples: int, codes=("TOC", "S1", "S2", "TMAX"), prefix: str = "A") -> ReviewSet:
    for code in codes:
        analyte(code)
    of, columns = table(report(home.project), codes)
    number = ReviewSet.objects.filter(well=home).count() + 1
    review_set = ReviewSet.objects.create(project=home.project, well=home, number=number)
    for n in range(1, samples + 1):
        sample = Sample.objects.create(
            well=home, kind="cuttings", label=f"{prefix}-{n}", match_key=f"{prefix}{n}", top_md_m=2000 + 10 * n,
            base_md_m=2010 + 10 * n,
        )  # fmt: skip
        values = {"TOC": 1.0 + n / 10, "S1": 0.4, "S2": 3.0 + n, "TMAX": 430 + n, "HI": 300 + n, "RO": 0.6}
        made = results(sample, of, columns, n + 1, {code: values[code] for code in codes})
        ReviewItem.objects.create(review_set=review_set, analysis=made)
    return review_set


def flag(about: Result, rule: str = "tmax_range", severity: str = "warn", run: QcRun | None = None, **fields) -> Flag:
    """A flag of the latest run on one result."""
    home = about.analysis.sample.well
    run = run or qc_run(home)
    defaults = {
        "result": about, "analysis": about.analysis, "analyte": about.analyte.code, "value": about.value, "family": "validity",
        "message": f"{about.analyte} looks odd", "source": "test (DEF)", "fingerprint": f"{rule}-{about.pk}",
        "evidence": {},
    }  # fmt: skip
    return Flag.objects.create(run=run, well=home, rule=rule, severity=severity, **{**defaults, **fields})


def qc_run(home: Well) -> QcRun:
    rule_set, _ = RuleSet.objects.get_or_create(
        project=None, name="standard", version=1, defaults={"thresholds": {}, "reason": "start"}
    )
    run = QcRun.objects.filter(wells=home).first() or QcRun.objects.create(project=home.project, rule_set=rule_set)
    run.wells.add(home)
    return run


def rich_well(project: Project, samples: int = 120, seed: int = 7) -> ReviewSet:
    """A realistic well: two kerogens over a maturity gradient, matrix retention, oil-based mud below 2600 m."""
    dice = random.Random(seed)
    home = well(project, "Ambry Fold 2")
    FormationTop.objects.bulk_create([
        FormationTop(well=home, name=name, top_md_m=top)
        for name, top in (("Tarn Shale", 1900), ("Ossel Marl", 2180), ("Quern Formation", 2420), ("Bract Sand", 2760))
    ])  # fmt: skip
    CasingShoe.objects.create(well=home, md_m=2150, diameter_in=9.625)
    CoreRun.objects.create(well=home, number=1, top_md_m=2450, base_md_m=2477, recovered_m=26)
    MudInterval.objects.create(well=home, top_md_m=0, base_md_m=2600, kind="water")
    MudInterval.objects.create(well=home, top_md_m=2600, base_md_m=3200, kind="oil", additives="base oil")
    codes = list(UNITS)
    for code in codes:
        analyte(code)
    of, columns = table(report(project), codes)
    review_set = ReviewSet.objects.create(project=project, well=home, number=1)
    for n in range(samples):
        top = 1950 + n * (1000 / samples)
        made = _sample(review_set, of, columns, n, top=top, values=_rock(dice, top))
        ReviewItem.objects.create(review_set=review_set, analysis=made)
    _flags(review_set)
    return review_set


def _rock(dice: random.Random, top: float) -> dict:
    """Values of one sample from depth: TOC by unit, S2 from TOC less what the matrix keeps, Tmax from maturity."""
    level, hydrogen = (
        (1.1, 380) if top < 2180 else (0.6, 210) if top < 2420 else (3.4, 440) if top < 2760 else (0.4, 120)
    )
    toc = max(0.08, dice.lognormvariate(0, 0.45) * level)
    maturity = 424 + (top - 1950) * 0.024
    s2 = max(0.04, hydrogen / 100 * toc - 0.4 + dice.gauss(0, 0.25))
    s1 = s2 * (0.05 + (top - 1950) / 9000) * dice.lognormvariate(0, 0.2)
    if top > 2600:
        s1 += 1.4 * dice.lognormvariate(0, 0.4)
    s3 = max(0.05, 0.25 + 0.15 * toc + dice.gauss(0, 0.08))
    tmax = maturity + dice.gauss(0, 2.2) - (11 if top > 2600 and dice.random() < 0.5 else 0)
    values = {"TOC": toc, "S1": s1, "S2": s2, "S3": s3, "TMAX": tmax, "PI": s1 / (s1 + s2), "OI": 100 * s3 / toc}
    if dice.random() < 0.15:
        values["RO"] = 0.35 + (top - 1950) * 0.00055 + dice.gauss(0, 0.02)
    if s2 < 0.12:
        values["S2"] = "<0.10"
        del values["PI"]
        values["TMAX"] = dice.uniform(330, 520)
    elif dice.random() < 0.9:
        values["HI"] = 100 * s2 / toc
    if s1 < 0.05:
        values["S1"] = "<0.05"
        values.pop("PI", None)
    return values


def _sample(review_set: ReviewSet, of: SourceTable, columns, n: int, *, top: float, values: dict) -> Analysis:
    core = 2450 <= top <= 2477
    sample = Sample.objects.create(
        well=review_set.well, kind="core" if core else "cuttings", label=f"AF2-{n + 1:03}", match_key=f"AF2{n}",
        top_md_m=round(top, 2), base_md_m=round(top + (0.1 if core else 8), 2),
    )  # fmt: skip
    return results(sample, of, columns, n + 2, values)


def _flags(review_set: ReviewSet) -> None:
    """The firings of a few rules, and the fit of S2 on TOC, as the QC room writes them."""
    run = qc_run(review_set.well)
    for row in Result.objects.filter(analysis__review_item__review_set=review_set).select_related(
        "analyte", "analysis__sample__well"
    ):
        code, value = row.analyte.code, row.value
        if code == "PI" and value > 0.3 and row.analysis.sample.top_md_m < 2900:
            flag(row, "pi_high_for_maturity", run=run, family="contamination",
                 message=f"PI {value:.2f} is above 0.30 at this maturity",
                 evidence={"value": value, "limit": 0.3, "alternatives": ["producible oil in place", "migrated oil"]},
                 source="Peters & Cassa 1994, AAPG Memoir 60 (MEM)")  # fmt: skip
        if code == "TMAX" and (value < 400 or value > 510):
            flag(row, "tmax_range", "reject-candidate", run=run, message=f"Tmax {value:.0f} is outside 400 to 510",
                 evidence={"value": value, "limit_low": 400, "limit_high": 510})  # fmt: skip
    first = Result.objects.filter(analysis__review_item__review_set=review_set, analyte__code="S2").first()
    flag(first, "s2_toc_fit", run=run, result=None, analysis=None, family="suppression", analyte="HI",
         message="S2 on TOC meets the TOC axis at 0.11 wt%: S2 held back by the matrix, or inert carbon",
         evidence={"slope": 4.31, "intercept": -0.47, "toc0": 0.11, "toc0_low": 0.08, "toc0_high": 0.14, "n": 41},
         source="Langford & Blanc-Valleron 1990, AAPG Bulletin 74 (MEM)")  # fmt: skip
