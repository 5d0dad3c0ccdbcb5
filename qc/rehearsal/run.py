"""Inject known faults into a copy of the table, run the rules in memory, count what they catch."""

import hashlib
from collections import Counter
from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from qc.rehearsal.copying import Copy
from qc.rehearsal.faults import KINDS
from qc.rehearsal.flagged import LIMITS_OF_READING, Flagged, doubted, flagged, fresh, fresh_sets
from qc.rehearsal.kind import SAMPLE, STRENGTHS, Injected, Kind
from qc.rules import RULES
from qc.rules.engine import RuleSetValues, run
from qc.rules.rule import Answer
from qc.rules.spans import num, word
from qc.rules.table import Table

SHARE = 0.1  # of the samples that can carry a fault, in one run of the rules
REPEATS = 1
PER_RUN_MIN, PER_RUN_MAX = 5, 60
SPARSE_REPEATS = 3
EXAMPLES = 5
Step = Callable[[int, int, str], None]


@dataclass(frozen=True)
class Terms:
    """The rule set as the project has it, and what people have said already.

    ``dismissed``: fingerprints of flags that a reviewer dismissed. ``faulty``: samples with an accepted fault (a value
    rejected or held, a flag agreed to).
    """

    thresholds: RuleSetValues = field(default_factory=dict)
    disabled: Collection[str] = ()
    dismissed: Collection[str] = ()
    faulty: frozenset[int] = frozenset()

    def ask(self, table: Table) -> Mapping[str, Answer]:
        """Every rule over the table."""
        return run(table, self.thresholds, self.disabled, self.dismissed)


@dataclass
class Tally:
    """What became of the faults of one kind and strength."""

    injected: int = 0
    caught: int = 0
    rules: Counter[str] = field(default_factory=Counter)
    missed: list[str] = field(default_factory=list)


@dataclass
class Alarms:
    """New marks on samples that were not touched, over all runs."""

    samples: int = 0
    flagged: int = 0
    by_rule: Counter[str] = field(default_factory=Counter)
    sets: Counter[str] = field(default_factory=Counter)


@dataclass
class Stage:
    """The table as it is, what the rules say of it, and the alarms raised over all copies."""

    table: Table
    terms: Terms
    before: Flagged
    alarms: Alarms = field(default_factory=Alarms)

    @property
    def free(self) -> pd.Index:
        """Rows of samples that no rule doubts and no person found at fault."""
        rows = self.table.rows
        clouded = doubted(self.before) | set(self.terms.faulty)
        return rows.index[~rows["sample"].isin(clouded) & rows["role"].eq("sample")]

    def count(self, changed: Table, kind: Kind, made: list[Injected], tally: Tally) -> None:
        """Ask the rules about one copy and count what they caught."""
        now = flagged(changed, self.terms.ask(changed))
        for one in made:
            by = caught_by(self.table, kind, one, now=now, before=self.before)
            tally.injected += 1
            tally.caught += bool(by)
            tally.rules.update(by)
            if not by:
                tally.missed.append(f"{_name(self.table, one.rows[0])}: {one.what}")
        self._count_alarms(now, {_sample(self.table, row) for one in made for row in (*one.rows, *one.partners)})

    def _count_alarms(self, now: Flagged, touched: set[int]) -> None:
        """New marks on samples that carry neither the injected nor an accepted fault."""
        clean = set(self.table.rows["sample"].unique().tolist()) - touched - set(self.terms.faulty)
        self.alarms.samples += len(clean)
        for sample in clean:
            rules = fresh(now, self.before, sample) - LIMITS_OF_READING
            self.alarms.flagged += bool(rules)
            self.alarms.by_rule.update(rules)
        sets = fresh_sets(now, self.before)
        self.alarms.sets.update(mark[0] for mark, held in sets.items() if not held & touched)


def rehearse(
    table: Table, terms: Terms, *, seed: int, repeats: int = REPEATS, step: Step = lambda done, total, note: None
) -> dict[str, Any]:
    """The answer of a rehearsal but for the names of project and rule set. The same table, terms and seed give the same."""
    step(0, 1, "the results as they are")
    stage = Stage(table, terms, flagged(table, terms.ask(table)))
    kinds: list[dict[str, Any]] = []
    for number, kind in enumerate(KINDS):
        targets = kind.targets(table, stage.free)
        for strength in STRENGTHS:
            step(2 * number + STRENGTHS.index(strength), 2 * len(KINDS), f"{kind.id}, {strength}")
            tally = Tally()
            for repeat in range(_repeats(kind, repeats) if targets else 0):
                copy = Copy(table)
                made = inject(copy, kind, strength, targets, _random(seed, kind, strength, repeat))
                if made:
                    stage.count(copy.table(), kind, made, tally)
            kinds.append(_entry(kind, strength, tally, targets=len(targets)))
    return {"seed": seed, "kinds": kinds, "false_alarms": _false_alarms(table, stage.before, terms, stage.alarms)}


def _repeats(kind: Kind, repeats: int) -> int:
    return max(repeats, SPARSE_REPEATS) if kind.sparse else repeats


def _random(seed: int, kind: Kind, strength: str, repeat: int) -> np.random.Generator:
    """A generator of its own for each run, so that adding a kind changes nothing in the others."""
    text = f"{seed}|{kind.id}|{strength}|{repeat}"
    return np.random.default_rng(int.from_bytes(hashlib.sha256(text.encode()).digest()[:8], "big"))


def inject(
    copy: Copy, kind: Kind, strength: str, targets: list[tuple[int, ...]], random: np.random.Generator
) -> list[Injected]:
    """Faults in a share of the targets, drawn at random; never two in one sample, sparse ones one a well and sample kind."""
    wanted = len(targets) if kind.scope != SAMPLE else _wanted(len(targets))
    made: list[Injected] = []
    used: set[int] = set()
    groups: set[tuple[int, str]] = set()
    for at in random.permutation(len(targets)):
        rows = targets[int(at)]
        group = (int(num(copy.rows, rows[0], "well")), word(copy.rows, rows[0], "kind"))
        samples = {_sample(copy.original, row) for row in rows}
        if samples & used or (kind.sparse and group in groups):
            continue
        one = kind.inject(copy, rows, strength, random)
        if one is None:
            continue
        made.append(one)
        used |= samples
        groups.add(group)
        if len(made) >= wanted:
            break
    return made


def _wanted(targets: int) -> int:
    """How many samples carry the fault in one run: few enough that neighbours and units stay what they are."""
    return int(np.clip(np.ceil(SHARE * targets), max(1, min(PER_RUN_MIN, targets // 4)), PER_RUN_MAX))


def caught_by(table: Table, kind: Kind, one: Injected, *, now: Flagged, before: Flagged) -> list[str]:
    """Rules that caught a fault: a new flag on at least half of its samples, or, for a unit or batch, one on the set.

    Limits of reading catch nothing unless they are meant for the kind.
    """
    samples = [_sample(table, row) for row in one.rows]
    by: Counter[str] = Counter()
    spoken = 0
    for sample in samples:
        rules = {rule for rule in fresh(now, before, sample) if rule in kind.rules or rule not in LIMITS_OF_READING}
        by.update(rules)
        spoken += bool(rules)
    found = set(by) if 2 * spoken >= len(samples) else set()
    if kind.scope != SAMPLE:
        sets = fresh_sets(now, before)
        found |= {mark[0] for mark, held in sets.items() if 2 * len(held & set(samples)) >= len(samples)}
    return sorted(found)


def _entry(kind: Kind, strength: str, tally: Tally, targets: int) -> dict[str, Any]:
    made = {
        "kind": kind.id, "title": kind.title, "strength": strength, "definition": kind.strengths[strength],
        "meant_rules": [rule.id for rule in RULES if rule.id in kind.rules], "applicable": tally.injected > 0,
        "candidates": targets, "injected": tally.injected, "caught": tally.caught,
        "rate": round(tally.caught / tally.injected, 4) if tally.injected else None,
        "rules": dict(sorted(tally.rules.items(), key=lambda pair: (-pair[1], pair[0]))), "missed": tally.missed[:EXAMPLES],
    }  # fmt: skip
    if not tally.injected:
        made["reason"] = kind.lacking if not targets else f"none of {targets} candidates can carry it at this strength"
    return made


def _false_alarms(table: Table, before: Flagged, terms: Terms, alarms: Alarms) -> dict[str, Any]:
    """On the results as they are, and on what injected faults left untouched."""
    rows = table.rows[~table.rows["sample"].isin(terms.faulty)]
    doubting = {sample: {rule for rule, _ in marks} - LIMITS_OF_READING for sample, marks in before.samples.items()}
    limits = {sample for sample, marks in before.samples.items() if any(rule in LIMITS_OF_READING for rule, _ in marks)}
    hit = rows["sample"].isin([sample for sample, rules in doubting.items() if rules])
    clean = set(rows["sample"])
    by_rule = Counter(rule for sample, rules in doubting.items() if sample in clean for rule in rules)
    return {
        "analyses": len(rows), "flagged": int(hit.sum()), "rate": _rate(int(hit.sum()), len(rows)),
        "by_rule": _sorted(by_rule),
        "left_out": {"analyses_with_accepted_fault": len(table.rows) - len(rows)},
        "limits_of_reading": {"rules": sorted(LIMITS_OF_READING), "analyses": int(rows["sample"].isin(limits).sum())},
        "sets": _sorted(Counter(mark[0] for mark in before.sets)),
        "after_injection": {
            "samples": alarms.samples, "flagged": alarms.flagged, "rate": _rate(alarms.flagged, alarms.samples),
            "by_rule": _sorted(alarms.by_rule), "sets": _sorted(alarms.sets),
        },
    }  # fmt: skip


def _rate(part: int, whole: int) -> float | None:
    return round(part / whole, 5) if whole else None


def _sorted(counts: Counter[str]) -> dict[str, int]:
    return dict(sorted(counts.items(), key=lambda pair: (-pair[1], pair[0])))


def _sample(table: Table, row: int) -> int:
    return int(num(table.rows, row, "sample"))


def _name(table: Table, row: int) -> str:
    return f"{word(table.wells, int(num(table.rows, row, 'well')), 'name')} {table.name(row)}"
