"""What the review page draws and lists: one JSON of columns, bands, flags, fits and standing. Read only."""

from collections import Counter
from collections.abc import Iterable
from typing import Any

from django.contrib.auth.models import User

from labdata.access import actions
from labdata.models import Well
from qc.models import Decision, Flag, FlagAnswer, ReviewSet, SignOff, Verdict
from qc.review import changes, figures, notes, seal
from qc.review.columns import SEVERITIES, VERDICTS, Rows, as_columns, read_rows
from qc.review.deciding import last_batch
from qc.review.standing import Standing, flag_answers, flags_of, results_of, standing, valid_signature
from qc.rules import RULES

HISTORY = 40
FIT_RULE = "s2_toc_fit"


def review_data(review_set: ReviewSet, user: User) -> dict[str, Any]:
    """All columns and everything beside them, with the version they are of."""
    rows = read_rows(review_set)
    decided = standing(results_of(review_set))
    answers = flag_answers(review_set)
    flags = list(flags_of(review_set).defer("evidence"))
    wide = _of_units(flags)
    told = [{**_flag(flag, rows, answers), "interval": _interval(wide.get(flag.pk))} for flag in flags]
    columns = as_columns(rows, decided, _severity(flags, told, rows))
    own = Decision.objects.filter(review_set=review_set, decided_by=user).exists()
    batch = last_batch(user, review_set)
    return {
        "set": {"id": review_set.pk, "version": review_set.version, "state": review_set.state},
        "may": sorted(str(action) for action in actions(user, review_set.project)),
        "decided_here": own,
        "last_batch": str(batch) if batch else None,
        "figures": figures.plain(),
        "verdicts": VERDICTS,
        "severities": SEVERITIES,
        "rows": _rows(rows),
        "columns": columns,
        "bands": bands(review_set.well),
        "flags": told,
        "fits": _fits(wide.values()),
        "rules": {rule.id: [rule.title, rule.tests] for rule in RULES if rule.id in {flag.rule for flag in flags}},
        "counts": _counts(rows, decided),
        "decisions": _decisions(rows, decided),
        "people": _people(decided),
        "signature": signature(valid_signature(review_set)),
        "records": _records(review_set),
        "notes": notes.told(review_set),
        "may_note": notes.may_write(user, review_set.project),
        "history": _history(review_set),
    }


def _rows(rows: Rows) -> dict[str, list[Any]]:
    """Identity of each row, column by column."""
    names = ("replicate", "sample", "label", "kind", "top", "base", "formation")
    values = list(zip(*rows.samples, strict=True)) or [()] * len(names)
    return {name: list(column) for name, column in zip(names, values, strict=True)}


def _flag(flag: Flag, rows: Rows, answers: dict[tuple[str, str], FlagAnswer]) -> dict[str, Any]:
    """A flag without its evidence, and where it points: row, column."""
    at, key = rows.place.get(flag.result_id or 0, (rows.of_analysis.get(flag.analysis_id or 0), flag.analyte))
    answer = answers.get((flag.rule, flag.fingerprint))
    said = None
    if answer:
        said = {"answer": answer.answer, "reason": answer.reason, "by": answer.answered_by.get_username()}
    return {
        "id": flag.pk, "rule": flag.rule, "family": flag.family, "severity": flag.severity, "row": at, "key": key,
        "value": flag.value, "message": flag.message, "source": flag.source, "mark": flag.fingerprint, "answer": said,
        "result": flag.result_id,
    }  # fmt: skip


def _severity(flags: list[Flag], told: list[dict[str, Any]], rows: Rows) -> dict[int, int]:
    """The gravest severity per result, dismissed flags left out (as in ``flagged_results``)."""
    by_row: dict[int, list[tuple[str, int]]] = {}
    for pk, (at, key) in rows.place.items():
        by_row.setdefault(at, []).append((key, pk))
    found: dict[int, int] = {}
    for flag, said in zip(flags, told, strict=True):
        dismissed = said["answer"] and said["answer"]["answer"] == FlagAnswer.Answer.DISMISSED
        if dismissed or said["row"] is None:
            continue
        grave = SEVERITIES.index(flag.severity)
        for key, pk in by_row.get(said["row"], ()):
            if pk == flag.result_id or (flag.result_id is None and flag.analyte in ("", key.split(" ")[0])):
                found[pk] = max(found.get(pk, 0), grave)
    return found


def _of_units(flags: list[Flag]) -> dict[int, Flag]:
    """Flags that speak of a whole unit or interval, with their evidence."""
    return Flag.objects.in_bulk([flag.pk for flag in flags if flag.analysis_id is None])


def _interval(flag: Flag | None) -> list[float] | None:
    """The depths that a flag of a unit speaks of [m]."""
    return flag.evidence.get("interval_m") if flag else None


def _fits(flags: Iterable[Flag]) -> list[dict[str, Any]]:
    """Lines of S2 on TOC with their interval, from the evidence of the rule that draws them."""
    made = []
    for flag in flags:
        if flag.rule != FIT_RULE:
            continue
        fit = flag.evidence.get("fit", flag.evidence)
        if "slope" in fit and "intercept" in fit:
            unit = flag.evidence.get("unit", {})
            made.append({
                "flag": flag.pk, "slope": fit["slope"], "intercept": fit["intercept"], "interval": fit.get("ci95"),
                "n": fit.get("n"), "unit": unit.get("formation", ""), "span": [min(fit["x"]), max(fit["x"])] if fit.get("x") else None,
            })  # fmt: skip
    return made


def bands(well: Well) -> dict[str, Any]:
    """What stands behind the points: tops of the newest version, cores, casing shoes, muds."""
    tops = list(well.tops.order_by("version", "top_md_m").values_list("version", "name", "top_md_m"))
    newest = tops[-1][0] if tops else ""
    return {
        "tops": [{"name": name, "top": top} for version, name, top in tops if version == newest],
        "cores": [
            {"number": run.number, "top": run.top_md_m, "base": run.base_md_m, "recovered": run.recovered_m}
            for run in well.core_runs.all()
        ],
        "casing": list(well.casing_shoes.values_list("md_m", flat=True)),
        "muds": [
            {"kind": mud.kind, "label": mud.get_kind_display(), "top": mud.top_md_m, "base": mud.base_md_m}
            for mud in well.muds.all()
        ],
    }


def _counts(rows: Rows, decided: dict[int, Standing]) -> dict[str, int]:
    counts = Counter(stand.verdict for stand in decided.values())
    known = sum(counts[verdict] for verdict in VERDICTS[1:])
    return {"results": len(rows.place), **{v: counts[v] for v in VERDICTS[1:]}, VERDICTS[0]: len(rows.place) - known}


def _decisions(rows: Rows, decided: dict[int, Standing]) -> list[dict[str, Any]]:
    """Rejected and held results with their reasons, as the signer must see them."""
    return [
        {
            "row": rows.place[pk][0], "key": rows.place[pk][1], "verdict": stand.verdict, "reason": stand.reason,
            "text": stand.text, "by": stand.decided_by, "at": stand.decided_at,
        }
        for pk, stand in sorted(decided.items(), key=lambda item: rows.place[item[0]])
        if stand.verdict in (Verdict.REJECTED, Verdict.HELD)
    ]  # fmt: skip


def _people(decided: dict[int, Standing]) -> dict[str, int]:
    """How many standing verdicts each person gave."""
    given = Counter(stand.decided_by for stand in decided.values() if stand.verdict != Verdict.UNDECIDED)
    return dict(given.most_common())


def signature(record: SignOff | None) -> dict[str, Any] | None:
    """The signature in force, and whether its seal holds."""
    if record is None:
        return None
    return {
        "by": record.signer_name, "at": record.signed_at, "meaning": record.meaning, "counts": record.counts,
        "seal": record.content_sha256, "holds": seal.holds(record),
    }  # fmt: skip


def _records(review_set: ReviewSet) -> list[dict[str, Any]]:
    """Every signature the set ever had, newest first; each has its record on paper."""
    rows = review_set.sign_offs.order_by("-pk").values_list("pk", "signer_name", "signed_at", "reopening")
    return [{"id": pk, "by": by, "at": at, "ended": ended is not None} for pk, by, at, ended in rows]


def _history(review_set: ReviewSet) -> list[dict[str, Any]]:
    """The latest changes in words, newest first."""
    return [event._asdict() for event in changes.history(review_set, latest=HISTORY)]
