"""Factors between elements, oxides and minerals, from IUPAC atomic masses unless stated."""

OXIDE_FACTOR = {
    "AL": ("AL2O3", 1.8894), "SI": ("SIO2", 2.1393), "CA": ("CAO", 1.3992), "MG": ("MGO", 1.6583), "K": ("K2O", 1.2046),
    "NA": ("NA2O", 1.3480), "TI": ("TIO2", 1.668), "FE": ("FE2O3", 1.4297), "MN": ("MNO", 1.2912), "P": ("P2O5", 2.2913),
    "S": ("SO3", 2.4971), "BA": ("BAO", 1.1165),
}  # fmt: skip
CALCITE_PER_CARBON = 8.333
DOLOMITE_AS_CALCITE = 1.086
CO2_PER_CARBON = 3.664
IRON_PER_PYRITE_SULFUR = 0.871
SULFUR_IN_PYRITE = 0.5345
SULFUR_IN_ANHYDRITE = 0.2355
SULFUR_IN_GYPSUM = 0.1862
SULFUR_PER_BARIUM = 0.2335
FEO_PER_FE2O3 = 0.8998
MOLAR = {"CAO": 56.077, "MGO": 40.304, "FEO": 71.844, "C": 12.011}
FLUORAPATITE = 55.60 / 42.22  # CaO per P2O5; composition of apatite-(CaF) as printed by webmineral
FRANCOLITE = 1.570  # CaO per P2O5 of carbonate-fluorapatite, McClellan's limit, from memory
# CaO in calcite: SSHADE calcite page; the others from formulae
LIME_IN = {"CALCITE": 0.5603, "DOLOMITE": 0.3041, "APATITE": 0.556, "ANHYDRITE": 0.4119, "GYPSUM": 0.3257}
FLOORS = {
    "SIO2": {"QUARTZ": 1.0, "K_FELDSPAR": 0.6476, "ALBITE": 0.6874},
    "MGO": {"DOLOMITE": 0.2186},
    "K2O": {"K_FELDSPAR": 0.1692},
}
