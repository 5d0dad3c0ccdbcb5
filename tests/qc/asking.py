"""Ask one rule about a few records, as a chemist would."""

from collections.abc import Iterable, Mapping
from typing import Any

from qc.rules import RULES
from qc.rules.engine import run
from qc.rules.records import table_of
from qc.rules.rule import Answer, Finding
from qc.rules.s2_toc import ARITHMETIC, CONTAMINATION

BEFORE = {"vr_low_suspect": {"ro_depth_trend"}}
FITTED = {"s2_toc_fit", "s2_retained", "s2_toc_outlier", "s2_positive_intercept"}

# the worked set of the S2-TOC line: TOC [wt%], S2 [mg/g]
TOC = (0.42, 0.61, 0.78, 0.95, 1.20, 1.48, 1.83, 2.10, 2.55, 3.02, 3.60, 4.25)
S2 = (0.78, 1.60, 2.34, 3.03, 4.19, 5.21, 6.80, 7.88, 9.86, 11.70, 9.10, 16.95)


def ask(rule: str, *records: Mapping[str, Any], **around: Any) -> Answer:
    """The rule's answer with the shipped thresholds, after the rules whose answers it reads."""
    before = {*CONTAMINATION, *ARITHMETIC, "s2_toc_fit"} if rule in FITTED else {"pi_high_for_maturity"}
    before |= BEFORE.get(rule, set())
    off = [other.id for other in RULES if other.id != rule and other.id not in before]
    return run(table_of(records, **around), disabled=off)[rule]


def only(rule: str, *records: Mapping[str, Any], **around: Any) -> Finding:
    """The one finding of the rule."""
    findings = ask(rule, *records, **around).findings
    assert len(findings) == 1, [finding.message for finding in findings]
    return findings[0]


def outcomes(rule: str, *records: Mapping[str, Any], **around: Any) -> set[str]:
    """The outcomes it gave, of checks that applied; ``not_applicable`` only when nothing applied."""
    given = set(ask(rule, *records, **around).outcome)
    return given - {"not_applicable"} or given


def worked_set(**changes: Any) -> list[dict[str, Any]]:
    """The worked set as cuttings of one formation with even Tmax; ``changes`` override every record."""
    return [
        {
            "label": f"W-{number}", "kind": "cuttings", "formation": "Ashgrove Shale", "top_m": 2000.0 + 10 * number,
            "base_m": 2010.0 + 10 * number, "TOC": f"{toc:.2f}", "S2": f"{s2:.2f}", "S1": "0.10",
            "TMAX": str(438 + number % 3), **changes,
        }
        for number, (toc, s2) in enumerate(zip(TOC, S2, strict=True))
    ]  # fmt: skip


def series(size: int, records: Iterable[Mapping[str, Any]] = (), **cells: Any) -> list[dict[str, Any]]:
    """``size`` like records down the hole, then the given ones."""
    made = [{"label": f"N-{n}", "top_m": 2000.0 + 5 * n, "formation": "Ashgrove Shale", **cells} for n in range(size)]
    return [*made, *(dict(record) for record in records)]
