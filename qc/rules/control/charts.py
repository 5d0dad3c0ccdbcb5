"""Control charts of a laboratory, method, analyte and material over time, and consensus between laboratories."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
import pandas as pd

from qc.rules.control.brackets import CHART, each, finding
from qc.rules.control.outliers import algorithm_a, grubbs, grubbs_critical, horrat
from qc.rules.control.series import WARNING, cusum, ewma, multirule
from qc.rules.panels import unit_of
from qc.rules.robust import modified_z
from qc.rules.rule import CANNOT_EVALUATE, FIRE, INFO, NOT_APPLICABLE, PASS, REJECT, WARN, Answer, Rule, say
from qc.rules.spans import Floats
from qc.rules.table import Table

Signal = tuple[str, str, Any, Any]  # severity, what is said, computed, limit
SKEWED = frozenset({"S1", "S2", "TOC", "KAIR", "KLINK"})
IN_CONTROL = 3.5  # modified z of baseline points


@dataclass(frozen=True)
class Chart:
    """One series in order of time: its places in the controls, mean and deviation of its baseline, NaN without one."""

    places: tuple[int, ...]
    values: Floats
    runs: tuple[object, ...]
    mean: float
    deviation: float
    start: int


def chart_of(group: pd.DataFrame, baseline_min: int) -> Chart:
    """The chart of one series; the first ``baseline_min`` points that are in control freeze mean and deviation."""
    known = group[group["value"].notna() & ~group["q"].isin(["<", ">"])]
    values = known["value"].to_numpy(dtype=float)
    mean = deviation = float("nan")
    if len(values) > baseline_min:
        first = values[:baseline_min]
        score = modified_z(first)
        kept = first[~(np.abs(score) > IN_CONTROL)]
        mean, deviation = float(kept.mean()), float(kept.std(ddof=1))
    runs = tuple(zip(known["report"], known["table"], strict=True))
    return Chart(tuple(int(at) for at in known.index), values, runs, mean, deviation, baseline_min)


def charts(controls: pd.DataFrame, baseline_min: int) -> list[Chart]:
    """The charts of all reference materials, in order."""
    of = controls[controls["role"] == "reference"]
    return [chart_of(group, baseline_min) for _, group in of.groupby(CHART, sort=True)] if len(of) else []


def _signals(table: Table, baseline_min: int, read: Callable[[Chart], dict[int, Signal]]) -> Answer:
    """One check a charted control and well that it brackets; not applicable where the chart has no baseline yet."""
    if not (table.controls["table"] >= 0).any():
        return each(table, lambda place: (NOT_APPLICABLE, None))
    state: dict[int, str] = {}
    found: dict[int, Signal] = {}
    for chart in charts(table.controls, baseline_min):
        if not chart.deviation > 0:
            continue
        state.update(dict.fromkeys(chart.places[chart.start :], PASS))
        found.update({chart.places[at]: signal for at, signal in read(chart).items()})

    def judge(place: int) -> tuple[str, Any]:
        if place not in found:
            return state.get(place, NOT_APPLICABLE), None
        severity, text, computed, limit = found[place]

        def tell(rows: tuple[int, ...]) -> Any:
            more = {
                "alternatives": ["drift of the instrument", "new lot under an old name", "control of another material"]
            }
            return finding(table.controls.loc[place], rows, severity, text, computed=computed, limit=limit, **more)

        return FIRE, tell

    return each(table, judge)


def check_multirule(table: Table, *, baseline_min: float) -> Answer:
    """One check a charted control after its baseline: the six rules of the multirule scheme."""

    def read(chart: Chart) -> dict[int, Signal]:
        later = slice(chart.start, None)
        z = (chart.values[later] - chart.mean) / chart.deviation
        made: dict[int, list[str]] = {}
        for rule, places in multirule(z, chart.runs[later]).items():
            for at in places:
                made.setdefault(at, []).append(rule)
        return {at + chart.start: _said(rules, float(z[at])) for at, rules in made.items()}

    return _signals(table, int(baseline_min), read)


def _said(rules: list[str], z: float) -> Signal:
    only_warning = rules == [WARNING]
    return INFO if only_warning else REJECT, f"z {z:+.2f}, multirule {', '.join(rules)}.", round(z, 3), rules


def check_ewma(table: Table, *, baseline_min: float, weight: float, width: float) -> Answer:
    """One check a charted control after its baseline: the exponentially weighted average is within its limits."""

    def read(chart: Chart) -> dict[int, Signal]:
        made, half = ewma(chart.values[chart.start :], chart.mean, chart.deviation, weight=weight, width=width)
        return {
            int(at) + chart.start: (
                WARN, f"weighted average {say(made[at])} has left {say(chart.mean)} +- {say(half[at])}: drift.",
                round(float(made[at]), 5), [round(chart.mean - half[at], 5), round(chart.mean + half[at], 5)],
            )
            for at in np.flatnonzero(np.abs(made - chart.mean) > half)
        }  # fmt: skip

    return _signals(table, int(baseline_min), read)


def check_cusum(table: Table, *, baseline_min: float, slack: float, decision: float) -> Answer:
    """One check a charted control after its baseline: neither cumulative sum passes the decision limit."""

    def read(chart: Chart) -> dict[int, Signal]:
        high, low = cusum(chart.values[chart.start :], chart.mean, slack * chart.deviation)
        most, limit = np.maximum(high, low), decision * chart.deviation
        return {
            int(at) + chart.start: (
                WARN, f"cumulative sum {say(most[at])} has passed {say(limit)}: a lasting shift "
                f"{'up' if high[at] > low[at] else 'down'}.", round(float(most[at]), 5), round(limit, 5),
            )
            for at in np.flatnonzero(most > limit)
        }  # fmt: skip

    return _signals(table, int(baseline_min), read)


def _replicates(table: Table, least: int, outlier: Callable[[Floats, str], dict[int, Signal] | None]) -> Answer:
    """One check a control among the replicates of its material in its own table."""
    controls, verdict = table.controls, {}
    near = controls[
        (controls["table"] >= 0) & (controls["role"] == "reference") & controls["value"].notna() & (controls["q"] == "")
    ]
    for key, group in near.groupby(["table", *CHART], sort=True):
        if len(group) < least:
            continue
        found = outlier(group["value"].to_numpy(dtype=float), str(key[4]))  # type: ignore[index]
        for at, place in enumerate(group.index):
            verdict[int(place)] = CANNOT_EVALUATE if found is None else found.get(at)

    def judge(place: int) -> tuple[str, Any]:
        if place not in verdict:
            return NOT_APPLICABLE, None
        signal = verdict[place]
        if signal is None or isinstance(signal, str):
            return signal or PASS, None
        severity, text, computed, limit = signal
        return FIRE, partial(_replicate, controls.loc[place], severity, text, computed, limit)

    return each(table, judge)


def _replicate(control: Any, severity: str, text: str, computed: Any, limit: Any, rows: tuple[int, ...]) -> Any:  # noqa: PLR0917
    return finding(
        control, rows, severity, text, computed=computed, limit=limit, alternatives=["one bad run", "wrong material"]
    )


def check_robust_z(table: Table, *, z_max: float, samples_min: float) -> Answer:
    """One check a replicate of one material among eight or more of its table: modified z within the limit."""

    def outlier(values: Floats, analyte: str) -> dict[int, Signal] | None:
        z = modified_z(np.log(values) if analyte in SKEWED and (values > 0).all() else values)
        if np.isnan(z).any():
            return None
        return {
            int(at): (WARN, f"modified z {z[at]:+.2f} among its replicates.", round(float(z[at]), 3), z_max)
            for at in np.flatnonzero(np.abs(z) > z_max)
        }

    return _replicates(table, int(samples_min), outlier)


def check_grubbs(table: Table, *, alpha: float, samples_min: float) -> Answer:
    """One check a replicate of one material among six or more of its table: Grubbs, two-sided, one outlier."""

    def outlier(values: Floats, _analyte: str) -> dict[int, Signal] | None:
        g, at = grubbs(values)
        critical = grubbs_critical(len(values), alpha, two_sided=True)
        if np.isnan(g):
            return None
        return (
            {at: (WARN, f"Grubbs G {g:.3f} > {critical:.3f} (two-sided).", round(g, 4), round(critical, 4))}
            if g > critical
            else {}
        )

    return _replicates(table, int(samples_min), outlier)


def _laboratories(table: Table, least: int) -> list[pd.DataFrame]:
    """Means a laboratory of each material, lot and analyte that enough laboratories measured; the group's places kept."""
    known = table.controls[
        (table.controls["role"] == "reference") & table.controls["value"].notna() & (table.controls["q"] == "")
    ]
    if known["laboratory"].nunique() < least:
        return []
    groups = known.groupby(["project", "method", "analyte", "material", "lot"], sort=True)
    return [group for _, group in groups if group["laboratory"].nunique() >= least]


def check_consensus(table: Table, *, questionable: float, action: float, laboratories_min: float) -> Answer:
    """One check a control of a material that many laboratories measured: its laboratory's mean against the robust mean."""
    verdict: dict[int, Any] = {}
    for group in _laboratories(table, int(laboratories_min)):
        means = group.groupby("laboratory")["value"].mean()
        made = algorithm_a(means.to_numpy(dtype=float))
        for place, laboratory in zip(group.index.tolist(), group["laboratory"], strict=True):
            verdict[int(place)] = (float(means[laboratory]), made)

    def judge(place: int) -> tuple[str, Any]:
        if place not in verdict:
            return NOT_APPLICABLE, None
        mean, made = verdict[place]
        if np.isnan(made.deviation):
            return CANNOT_EVALUATE, None
        z = (mean - made.mean) / made.deviation

        def tell(rows: tuple[int, ...]) -> Any:
            text = f"the laboratory's mean {say(mean)} is {z:+.1f} robust deviations from {say(made.mean)} of all."
            severity = WARN if abs(z) >= action else INFO
            rounds = [[round(one, 6) for one in step] for step in made.rounds[:10]]
            return finding(
                table.controls.loc[place], rows, severity, text, computed=round(z, 3), limit=questionable, rounds=rounds
            )

        return (FIRE if abs(z) > questionable else PASS), tell

    return each(table, judge)


def check_horwitz(table: Table, *, ratio_low: float, ratio_high: float, laboratories_min: float) -> Answer:
    """One check a control of a material that many laboratories measured: spread between them as Horwitz expects."""
    verdict: dict[int, float] = {}
    for group in _laboratories(table, int(laboratories_min)):
        means = group.groupby("laboratory")["value"].mean().to_numpy(dtype=float)
        per = {"wt%": 100.0, "mg/g": 1e3, "ug/g": 1e6}.get(unit_of(str(group["analyte"].iloc[0])))
        if per and means.mean() > 0:
            made = horrat(100 * means.std(ddof=1) / means.mean(), means.mean() / per)
            verdict.update(dict.fromkeys((int(place) for place in group.index), float(made)))

    def judge(place: int) -> tuple[str, Any]:
        if place not in verdict:
            return NOT_APPLICABLE, None
        made = verdict[place]

        def tell(rows: tuple[int, ...]) -> Any:
            text = f"HorRat {say(made)} between laboratories."
            severity = INFO if table.controls.at[place, "analyte"] in {"S1", "S2", "S3"} else WARN
            return finding(
                table.controls.loc[place], rows, severity, text, computed=round(made, 3), limit=[ratio_low, ratio_high]
            )

        return (PASS if ratio_low <= made <= ratio_high else FIRE), tell

    return each(table, judge)


def _rule(id_: str, title: str, tests: str, check: Any, **words: Any) -> Rule:
    return Rule(
        id=id_,
        family="lab_control",
        title=title,
        tests=tests,
        check=check,
        inputs=("TOC", "S2", "TMAX"),
        flags="TOC",
        **words,
    )


RULES = (
    _rule(
        "control_multirule", "Controls stay within their chart", "Controls after the baseline are judged by six rules on their z-scores.",
        check_multirule,
        formula="1-2s, 1-3s, 2-2s, R-4s (one above +2 and one below -2 in one run), 4-1s, 10-x; strict inequalities",
        message="A control breaks a rule of its chart",
        source="Westgard et al. 1981, Clin. Chem. 27:493, as several public pages define the rules",
        must_not_fire="Before 20 baseline points; a new lot begins a new chart. 1-2s alone is information, not rejection.",
        example="z 2.1, 2.4 breaks 2-2s; z -0.5, 1.9, -1.9 breaks none.",
    ),
    _rule(
        "ewma_drift", "Controls do not drift", "The exponentially weighted average of the controls stays within its limits.", check_ewma,
        formula="EWMA = w x + (1-w) EWMA; limits target +- L s sqrt(w/(2-w) (1-(1-w)^2t)), w 0.3, L 3",
        message="The controls drift", source="NIST/SEMATECH e-Handbook 6.3.2.4, partly read; its numbers from memory, recomputed",
        must_not_fire="Before 20 baseline points; a new lot begins a new chart.",
        example="Target 50, s 2.0539: limits 47.41 and 52.59; the handbook's twenty points give no signal.",
    ),
    _rule(
        "cusum_shift", "Controls do not shift", "Cumulative sums of the controls above and below target stay below the decision limit.",
        check_cusum,
        formula="SH = max(0, SH + x - (T+K)), SL = max(0, SL + (T-K) - x); signal > H; K = 0.5 s, H = 5 s",
        message="The controls have shifted",
        source="Montgomery & Runger, Applied Statistics and Probability for Engineers, Example 16-6",
        must_not_fire="Before 20 baseline points; a new lot begins a new chart.",
        example="T 99, K 1, H 10: the book's twenty points never signal.",
    ),
    _rule(
        "robust_z_batch", "Replicates agree", "Among eight or more replicates of one material in one table none stands apart.", check_robust_z,
        formula="|0.6745 (x - median)/MAD| > 3.5; logarithms for S1, S2, TOC and permeability",
        message="A replicate stands apart", source="limit: Iglewicz & Hoaglin 1993, read second hand",
        must_not_fire="On samples of rock: geology varies. Without scale (MAD 0) it cannot be evaluated.",
        example="3.10 among ten of about 2.34 fires.",
    ),
    _rule(
        "grubbs_single", "No outlier among replicates", "Among six or more replicates of one material in one table none is an outlier by Grubbs.",
        check_grubbs,
        formula="G = max|x - mean|/s > critical value, two-sided, one outlier an application",
        message="A replicate is an outlier by Grubbs' test", source="NIST/SEMATECH e-Handbook 1.3.5.17, description read",
        must_not_fire="On fewer than six, and on samples of rock.",
        example="Uranium data: G 2.4688 > 2.127 (two-sided, n 8).",
    ),
    _rule(
        "robust_consensus", "Laboratories agree", "A laboratory's mean of a material is near the robust mean of all laboratories.", check_consensus,
        formula="algorithm A: clip at 1.5 s*, s* = 1.134 SD; |z| > 2 informs, >= 3 warns",
        message="A laboratory is away from the consensus",
        source="ISO 13528, algorithm A, as three public pages give it (PMC7084476); limits from memory of ISO 13528",
        must_not_fire="On fewer than five laboratories; where half the values are alike it cannot be evaluated.",
        example="Ten values: x* 2.3453, s* 0.0516; 3.10 is 14.6 s* away.",
    ),
    _rule(
        "horwitz_check", "Spread between laboratories", "The spread between laboratories is as Horwitz's function expects.", check_horwitz,
        formula="PRSD = 2^(1 - 0.5 log10 C) %, Thompson's ends; HorRat outside 0.5-2",
        message="Laboratories spread more, or less, than expected", source="IUPAC Gold Book 08078; AOAC, HorRat",
        must_not_fire="Within one laboratory; S1, S2, S3 are defined by their method: information only.",
        example="TOC 2.15 %: 3.56 % expected, 5.0 observed, HorRat 1.40 passes.",
    ),
)  # fmt: skip
