"""The corpus of made-up workbooks: every value is right or asked about, none is wrong, none is lost."""

from collections import Counter

import pytest

from labdata.intake.preparing import Request, prepare_file
from tests.factories import ProjectFactory
from tests.intake.corpus import corpus

pytestmark = pytest.mark.django_db


def read(project, made, answers):
    request = Request(
        project,
        made.name,
        made.content,
        "0" * 64,
        well="" if made.book.show_well else "Quill 1",
        create_wells=True,
        answers=answers,
    )
    return prepare_file(request, lambda note: None)


def results(prepared):
    """{(sheet, address): (code, value, qualifier, label, depth)} of what would be stored."""
    found = {}
    for table in prepared.tables:
        for column in table.results:
            settled = table.settled[column.index]
            for at, row in enumerate(table.rows):
                if row.kept and settled.states[at] == "value":
                    address = table.found.sheet.address(row.line - 1, column.index)
                    found[table.sheet, address] = (
                        column.field,
                        settled.values[at],
                        settled.qualifiers[at],
                        row.label,
                        row.top_m,
                    )
    return found


def named(prepared):
    """Addresses that errors and questions name."""
    return {(f.sheet, f.cell) for f in prepared.findings.found if f.level in {"error", "question"}}


def same(expected, got):
    code, value, qualifier, label, top = expected
    close = got[1] is not None and abs(got[1] - value) <= 1e-9 * max(1.0, abs(value))
    deep = (got[4] is None) == (top is None) and (top is None or abs(got[4] - top) < 1e-6)
    return (got[0], got[2]) == (code, qualifier) and close and deep and (got[3] == label or label.startswith(got[3]))


def answered(prepared, made):
    """The right answers to what was asked, of those that the file's making expects."""
    given = {}
    for finding in prepared.findings.found:
        if finding.level == "question" and finding.code == "depth_unit_missing" and "depth" in made.book.answers:
            given[finding.id] = made.book.answers["depth"]
    return given


def judge(project, made):
    """(counts, complaints) of one file."""
    prepared = read(project, made, {})
    asked = bool(prepared.findings.has("question"))
    if asked:
        given = answered(prepared, made)
        if not given:
            return Counter(asked=len(made.truth)), [
                f"asks {[f.id for f in prepared.findings.found if f.level == 'question']}"
            ]
        prepared = read(project, made, given)
    got, counts, complaints = results(prepared), Counter(), []
    for place, expected in made.truth.items():
        if place not in got:
            counts["lost"] += 1
            complaints.append(f"lost {place} {expected}")
        elif not same(expected, got[place]):
            counts["wrong"] += 1
            complaints.append(f"wrong {place} {expected} {got[place]}")
        else:
            counts["asked" if asked else "right"] += 1
    for place in set(got) - set(made.truth):
        counts["wrong"] += 1
        complaints.append(f"made up {place} {got[place]}")
    for place in made.bad:
        counts["asked" if place in named(prepared) else "lost"] += 1
        complaints += [] if place in named(prepared) else [f"not named {place}"]
    if not made.bad and not asked and prepared.findings.has("error"):
        complaints.append(f"refused {[f.message for f in prepared.findings.found if f.level == 'error'][:3]}")
    return counts, complaints


def test_every_value_is_right_or_asked_about():
    project = ProjectFactory()
    total, complaints, files = Counter(), {}, 0
    for made in corpus():
        counts, said = judge(project, made)
        total += counts
        files += 1
        if said:
            complaints[made.name] = said
    print(
        f"{files} files: {total['right']} right, {total['asked']} asked, {total['wrong']} wrong, {total['lost']} lost"
    )
    assert complaints == {}
    assert (total["wrong"], total["lost"]) == (0, 0)
    assert files >= 150
    assert total["right"] > 5 * total["asked"]
