"""Elements and minerals: what stoichiometry allows."""

from qc.rules.composition import carbon, limits, mixups, pairs, phosphorus, totals, traces

RULES = (
    *totals.RULES, *carbon.RULES, *phosphorus.RULES, *mixups.RULES, *limits.RULES, *traces.RULES, *pairs.RULES,
)  # fmt: skip
