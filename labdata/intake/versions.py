"""Which report a file is, and whether it is a later version of one that is held."""

from labdata.intake.prepared import Prepared
from labdata.intake.titles import Facts, split_file_name
from labdata.models import Analysis, Report

AMENDED, SEPARATE = "amended version", "separate report"
WITHDRAWN, STILL_VALID = "withdrawn", "still valid"


def settle_version(file_name: str, facts: Facts, made: Prepared) -> None:
    """Set the report's number and what it supersedes; ask where the file does not say which version it is."""
    stem, revision, amended = split_file_name(file_name)
    made.number = (facts.report or stem)[:100]
    made.revision = facts.revision if facts.revision is not None else revision
    held = _held(made, facts)
    if held is None:
        if (made.revision or 1) > 1:
            made.findings.note(
                "earlier_version_missing",
                f"The file says revision {made.revision}; no earlier version of «{made.number}» is held.",
                value=made.number,
                remedy="Bring the earlier version in first if it exists.",
            )
        return
    if _later(made.revision, held) or (made.revision is None and (facts.amended or amended)):
        made.supersedes = held.pk
    else:
        answer = made.findings.ask(
            "version", "version_unstated",
            f"Report «{held.number}» is held already (version {held.version}) with other content, and «{file_name}» does not say that it is a later version.",
            [AMENDED, SEPARATE], value=held.number,
        )  # fmt: skip
        if answer == AMENDED:
            made.supersedes = held.pk
        elif answer == SEPARATE:
            made.number = _free_number(made, stem)
    if made.supersedes:
        _missing_rows(made, held)


def _held(made: Prepared, facts: Facts) -> Report | None:
    """The newest version of the report that this file may follow. Another laboratory's report of the same number is another."""
    numbers = [made.number, *([facts.supersedes] if facts.supersedes else [])]
    found = (
        Report.objects.filter(project=made.project, number__in=numbers)
        .select_related("laboratory")
        .order_by("-version")
        .first()
    )
    if (
        found
        and made.laboratory
        and found.laboratory
        and found.laboratory.name.casefold() != made.laboratory.casefold()
    ):
        made.number = f"{made.number} ({made.laboratory})"[:120]
        return Report.objects.filter(project=made.project, number=made.number).order_by("-version").first()
    return found


def _later(revision: int | None, held: Report) -> bool:
    """True when the revision stated is later than the one that the held version stated (an original counts as 0 or 1)."""
    before = held.difference.get("revision")
    return revision is not None and revision > (
        before if before is not None else held.version if held.version > 1 else 0
    )


def _free_number(made: Prepared, stem: str) -> str:
    """A number that no report of the project has yet."""
    taken = set(Report.objects.filter(project=made.project).values_list("number", flat=True))
    names = [stem, *(f"{made.number} ({count})" for count in range(2, len(taken) + 3))]
    return next(name for name in names if name not in taken)


def _missing_rows(made: Prepared, held: Report) -> None:
    """A later version that lacks most of the earlier one's rows may be a partial one: asked, not guessed."""
    old = set(Analysis.objects.of_rock().current().filter(report=held).values_list("sample__well", "sample__match_key"))
    new = set()
    for table in made.tables:
        for row in table.rows:
            plan = made.wells.get(row.well)
            if row.kept and plan and plan.pk:
                new.add((plan.pk, row.match_key))
    missing = len(old - new)
    if missing and missing * 2 > len(old):
        answer = made.findings.ask(
            "missing_rows", "rows_missing",
            f"The file lacks {missing} of the {len(old)} samples of version {held.version} of «{held.number}».",
            [WITHDRAWN, STILL_VALID], value=held.number,
        )  # fmt: skip
        made.keep_missing = answer == STILL_VALID
