"""Elements of the demonstration rocks: a mixture of stated minerals, as an X-ray fluorescence table reports it.

The rock is calcite and dolomite (from its carbonate), organic matter (TOC / 0.8), pyrite (S = TOC / 2.8, the normal
marine ratio: Berner & Raiswell 1983), apatite, and the rest clay and quartz. Oxides follow from the minerals'
composition, loss on ignition closes the total to 100 wt%.
"""

import numpy as np
import pandas as pd

from labdata.demo.basin import FORMATIONS

# wt% of each oxide in the mineral; clay is an illite-rich mixture. LOI: what leaves at 1000 degC (pyrite takes up oxygen).
MINERALS = {
    "clay": {"SIO2": 51.0, "AL2O3": 26.5, "FE2O3": 5.5, "K2O": 6.5, "MGO": 2.4, "NA2O": 0.7, "TIO2": 0.9, "LOI": 6.5},
    "quartz": {"SIO2": 100.0},
    "calcite": {"CAO": 56.03, "LOI": 43.97},
    "dolomite": {"CAO": 30.41, "MGO": 21.86, "LOI": 47.73},
    "pyrite": {"FE2O3": 66.55, "LOI": 33.45},
    "apatite": {"CAO": 55.60, "P2O5": 42.22, "LOI": 2.18},
    "organic": {"LOI": 100.0},
}
OXIDES = ("SIO2", "AL2O3", "FE2O3", "CAO", "MGO", "K2O", "NA2O", "TIO2", "P2O5", "LOI")
CARBON_IN_ORGANIC = 0.80
CARBON_TO_SULPHUR = 2.8
# trace element: [ug/g per wt% Al2O3, ug/g per wt% TOC, ug/g floor]
TRACES = {"V": (6.5, 38.0, 8.0), "NI": (2.4, 12.0, 4.0), "MO": (0.05, 5.5, 0.1), "U": (0.12, 1.6, 0.3)}


def minerals(truth: pd.DataFrame, stream: np.random.Generator) -> pd.DataFrame:
    """Minerals [wt%] of the samples of ``truth`` (columns toc, carb, formation); rows sum to 100."""
    size = len(truth)
    dolomite = truth["carb"] * stream.uniform(0.05, 0.25, size)
    organic = truth["toc"] / CARBON_IN_ORGANIC
    pyrite = truth["toc"] / CARBON_TO_SULPHUR / 0.5345
    apatite = pd.Series(stream.uniform(0.15, 0.6, size), index=truth.index)
    rest = (100 - truth["carb"] - organic - pyrite - apatite).clip(lower=0.5)
    share = truth["formation"].map({name: unit.clay for name, unit in FORMATIONS.items()}).astype(float)
    clay = rest * (share + 0.05 * stream.standard_normal(size)).clip(0.05, 0.95)
    mixture = pd.DataFrame(
        {
            "clay": clay, "quartz": rest - clay, "calcite": truth["carb"] - dolomite, "dolomite": dolomite,
            "pyrite": pyrite, "apatite": apatite, "organic": organic,
        }
    )  # fmt: skip
    return mixture.div(mixture.sum(axis=1), axis=0) * 100


def elements(truth: pd.DataFrame, stream: np.random.Generator) -> pd.DataFrame:
    """Oxides and loss on ignition [wt%] and trace elements [ug/g] with 1 % and 6 % scatter, unrounded."""
    matrix = pd.DataFrame(MINERALS).reindex(OXIDES).fillna(0.0)
    oxides = minerals(truth, stream) @ matrix.T / 100
    oxides *= 1 + 0.006 * stream.standard_normal(oxides.shape)
    traces = {
        name: (aluminium * oxides["AL2O3"] + carbon * truth["toc"] + floor)
        * (1 + 0.06 * stream.standard_normal(len(truth)))
        for name, (aluminium, carbon, floor) in TRACES.items()
    }
    return oxides.assign(**traces)
