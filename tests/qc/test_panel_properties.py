"""Elements, plugs and isotopes: order and unrelated columns do not matter, every firing has a finding that is JSON."""

import json

import numpy as np
import pytest

from qc.rules import RULES, composition, isotopes, plugs
from qc.rules.engine import parameters, run
from qc.rules.evidence import Witness
from qc.rules.records import table_of
from qc.rules.rule import OUTCOMES

OURS = [rule.id for rule in (*composition.RULES, *plugs.RULES, *isotopes.RULES)]
OFF = [rule.id for rule in RULES if rule.id not in OURS]
CODES = {
    "elements": {"SIO2": 60, "AL2O3": 14, "FE2O3": 5, "CAO": 9, "MGO": 2, "K2O": 3, "P2O5": 1, "LOI": 9, "V": 300, "MO": 20, "U": 8, "CA": 64000},
    "minerals": {"QUARTZ": 40, "CALCITE": 20, "DOLOMITE": 6, "ILLITE": 30, "PYRITE": 3},
    "core": {"PHI": 9, "KAIR": 2, "KLINK": 1.4, "RHOB": 2.43, "RHOG": 2.66, "SO": 20, "SW": 60, "SG": 20},
    "isotopes": {"D13C_ORG": -28, "D18O_CARB": 5, "D13C_SAT": -29, "D13C_ARO": -28},
    "gc": {"PR_PH": 1.4, "CPI": 1.3},
    "carbon": {"TC": 4, "TOC": 2, "TIC": 2, "TS": 1},
}  # fmt: skip


def made(seed):
    """Records of eight samples by every method, each value off by up to a half, some missing, some below a limit."""
    generator = np.random.default_rng(seed)
    records = []
    for sample in range(8):
        for table, (method, codes) in enumerate(CODES.items()):
            record = {
                "method": method,
                "sample": sample,
                "label": f"S-{sample}",
                "top_m": 2000.0 + sample,
                "table": table,
            }
            for code, value in codes.items():
                text = f"{value * generator.uniform(0.5, 1.5):.2f}"
                record[code] = generator.choice([text, text, text, None, text if value < 0 else f"<{text}"])
            records.append({**record, "line": len(records) + 2})
    return records


def told(records):
    table = table_of(records)
    answers = run(table, disabled=OFF)
    return {
        rule: (sorted(answer.outcome), sorted(f"{finding.severity} {finding.message}" for finding in answer.findings))
        for rule, answer in answers.items()
    }


@pytest.mark.parametrize("seed", range(4))
def test_order_and_unrelated_columns_do_not_matter(seed):
    records = made(seed)
    plain = told(records)
    assert told([records[at] for at in np.random.default_rng(seed).permutation(len(records))]) == plain
    assert told([{**record, "NOTE": "x"} for record in records]) == plain


@pytest.mark.parametrize("seed", range(4))
def test_every_firing_has_a_finding_and_its_evidence_is_json(seed):
    table = table_of(made(seed))
    before = {method: frame.copy() for method, frame in table.panels.items()}
    witness, answers = Witness(table), run(table, disabled=OFF)
    for rule in (*composition.RULES, *plugs.RULES, *isotopes.RULES):
        answer = answers[rule.id]
        assert set(answer.outcome) <= set(OUTCOMES)
        assert answer.counts()["fire"] == len(answer.findings), rule.id
        for finding in answer.findings:
            json.dumps(witness.record(rule, parameters(rule, {}), finding), allow_nan=False)
            assert "nan" not in finding.message.split()
            assert len(witness.fingerprint(rule, parameters(rule, {}), finding)) == 64
    for method, frame in before.items():
        assert table.panels[method].equals(frame)


def test_methods_that_nobody_measured_cost_nothing():
    table = table_of([{"TOC": "1.20", "S2": "3.40"}])
    answers = run(table, disabled=OFF)
    assert {rule for rule, answer in answers.items() if len(answer.outcome)} == set()
