"""Routine core analysis of plugs: porosity, permeability, saturations, grain density."""

from qc.rules.plugs import grains, permeability, porosity

RULES = (porosity.POROSITY, permeability.ORDER, porosity.SATURATION, *grains.RULES, permeability.OUTLIER)
