"""Stable isotopes, gas and gas chromatography of extracts."""

from qc.rules.isotopes import chromatography, deltas, gases

RULES = (*deltas.RULES, *gases.RULES, *chromatography.RULES)
