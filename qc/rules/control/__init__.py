"""How a laboratory checks itself: reference materials, blanks, duplicates, charts, batches."""

from qc.rules.control import batches, charts, duplicates, references

RULES = (*references.RULES, *duplicates.RULES, *charts.RULES, *batches.RULES)
