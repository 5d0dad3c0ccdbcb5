"""The stated geological model from which every number of the demonstration is drawn.

Chain of cause, with z the true vertical depth [m] below the well's datum:

1. **Maturity.** log10 Ro = -0.62 + 2.1e-4 z (log-linear practice: Dow 1977, J. Geochem. Explor. 7:79).
   Tmax = (Ro + 7.16) / 0.0180, the relation ``jarvie2001`` turned round.
2. **Richness.** TOC is log-normal in each formation and correlated from sample to sample (AR(1), 0.5).
3. **Generation.** The transformation ratio TR is a logistic in Ro, centred at 0.85 (kerogen II) or 1.10 (III).
   HI = HI0 (1 - TR); PI = 0.04 + 0.36 TR.
4. **Matrix retention.** The rock yields g = HI TOC / 100; the matrix holds back r (1 - exp(-g/r)), so that S2
   = g - r for g >> r and S2 -> 0 for g << r: the S2-TOC line meets the TOC axis at 100 r / HI, not at the origin
   (Espitalie, Madec & Tissot 1980, AAPG Bull. 64:59).
5. **Free hydrocarbons** S1 = S2 PI / (1 - PI); **oxygen** S3 = TOC OI / 100, OI = OI0 (1 - TR / 2).
6. **Laboratory.** Each measured quantity gets its laboratory's relative and absolute scatter; Tmax 1.2 degC, more
   where S2 is small; the laboratory computes indices from what it measured, before rounding.

Deterministic: the same seed gives the same numbers.
"""

import numpy as np
import pandas as pd

from labdata.demo.basin import FORMATIONS, SAMPLING, SEED, WELLS, DemoLaboratory, DemoWell, Formation

RO_INTERCEPT, RO_SLOPE = -0.62, 2.1e-4
TR_CENTRE = {"II": (0.85, 0.09), "II/III": (0.95, 0.11), "III": (1.10, 0.14)}
HI_SCATTER = 0.04
TOC_MEMORY = 0.5


def generator(*keys: int) -> np.random.Generator:
    """The random stream of one part of the model, independent of every other part."""
    return np.random.default_rng([SEED, *keys])


def true_vertical_depth(well: DemoWell, md: np.ndarray) -> np.ndarray:
    """TVD [m] at measured depths ``md`` [m]: the integral of cos(inclination), inclination linear between stations."""
    if not well.survey:
        return md.astype(float)
    stations = np.array(well.survey)
    grid = np.arange(0.0, well.td + 1.0, 1.0)
    cosine = np.cos(np.radians(np.interp(grid, stations[:, 0], stations[:, 1])))
    depth = np.concatenate([[0.0], np.cumsum((cosine[1:] + cosine[:-1]) / 2)])
    return np.interp(md, grid, depth)


def reflectance(tvd: np.ndarray) -> np.ndarray:
    """Mean random vitrinite reflectance [%] at true vertical depth [m]."""
    return 10 ** (RO_INTERCEPT + RO_SLOPE * tvd)


def tmax_of(ro: np.ndarray) -> np.ndarray:
    """Tmax [degC] of a rock of reflectance ``ro`` [%]."""
    return (ro + 7.16) / 0.0180


def transformed(ro: np.ndarray, kerogen: str) -> np.ndarray:
    """Share of the kerogen's hydrogen already turned into hydrocarbons, 0 to 1."""
    centre, width = TR_CENTRE[kerogen]
    return 1 / (1 + np.exp((centre - ro) / width))


def retained(generated: np.ndarray, capacity: float) -> np.ndarray:
    """Hydrocarbons [mg/g rock] that the matrix keeps from the S2 peak."""
    return capacity * (1 - np.exp(-generated / capacity))


def rock(well: DemoWell) -> pd.DataFrame:
    """The true properties of every sample of ``well``, in the order of sampling.

    Columns: label, kind, top, base [m MD, base NaN for a plug], formation, tvd [m], ro [%], toc, carb [wt%], s1, s2,
    s3 [mg/g], tmax [degC].
    """
    samples = _sampled(well)
    middle = samples["top"].to_numpy() + np.nan_to_num(samples["base"].to_numpy() - samples["top"].to_numpy()) / 2
    samples["formation"] = _formation_at(well, middle)
    samples["tvd"] = true_vertical_depth(well, middle)
    samples["ro"] = reflectance(samples["tvd"].to_numpy())
    stream = generator(WELLS.index(well))
    parts = [
        _properties(FORMATIONS[str(name)], part, stream) for name, part in samples.groupby("formation", sort=False)
    ]
    return pd.concat(parts).sort_index()


def measured(truth: pd.DataFrame, laboratory: DemoLaboratory, stream: np.random.Generator) -> pd.DataFrame:
    """``truth`` as the laboratory measures it, unrounded, with the indices hi, oi [mg/g TOC] and pi."""
    table = truth.copy()
    size = len(table)
    for name, relative, absolute in laboratory.repeatability:
        spread = np.hypot(relative * table[name], absolute)
        table[name] = (table[name] + spread * stream.standard_normal(size)).clip(lower=absolute / 5)
    table["tmax"] += (1.2 + (0.25 / table["s2"]).clip(upper=6.0)) * stream.standard_normal(size)
    return with_indices(table)


def with_indices(table: pd.DataFrame) -> pd.DataFrame:
    """``table`` with hi, oi and pi computed from its toc, s1, s2 and s3."""
    return table.assign(
        hi=100 * table["s2"] / table["toc"],
        oi=100 * table["s3"] / table["toc"],
        pi=table["s1"] / (table["s1"] + table["s2"]),
    )


def _sampled(well: DemoWell) -> pd.DataFrame:
    """The samples of the well: running label, kind, top and base."""
    rows = []
    for plan in SAMPLING:
        if plan.well is well:
            count = round((plan.base - plan.top) / plan.step)
            tops = plan.top + plan.step * np.arange(count)
            bases = tops + plan.length if plan.length else np.full(count, np.nan)
            rows += [(plan.kind.value, top, base) for top, base in zip(tops.round(4), bases.round(4), strict=True)]
    table = pd.DataFrame(rows, columns=["kind", "top", "base"])
    table.insert(0, "label", [f"{well.prefix}-{number:03d}" for number in range(1, len(table) + 1)])
    return table


def _formation_at(well: DemoWell, md: np.ndarray) -> list[str]:
    tops = [depth for _, depth in well.tops]
    return [well.tops[position][0].name for position in np.searchsorted(tops, md, side="right") - 1]


def _properties(unit: Formation, part: pd.DataFrame, stream: np.random.Generator) -> pd.DataFrame:
    """Draw richness for the samples of one formation and follow the chain of cause."""
    size = len(part)
    ro = part["ro"].to_numpy()
    toc = unit.toc_median * np.exp(unit.toc_sigma * _correlated(size, stream))
    turned = transformed(ro, unit.kerogen)
    hi = unit.hi0 * (1 - turned) * (1 + HI_SCATTER * stream.standard_normal(size))
    generated = hi * toc / 100
    s2 = generated - retained(generated, unit.retention)
    pi = 0.04 + 0.36 * turned
    carbonate = (unit.carbonate + unit.carbonate_sd * stream.standard_normal(size)).clip(0.3, 96.0)
    s3 = toc * unit.oi0 * (1 - turned / 2) / 100
    return part.assign(toc=toc, carb=carbonate, s2=s2, s1=s2 * pi / (1 - pi), s3=s3, tmax=tmax_of(ro))


def _correlated(size: int, stream: np.random.Generator) -> np.ndarray:
    """A standard normal series in which neighbours resemble each other (AR(1))."""
    steps = stream.standard_normal(size)
    series = np.empty(size)
    last = 0.0
    for position, step in enumerate(steps):
        last = TOC_MEMORY * last + (1 - TOC_MEMORY**2) ** 0.5 * step if position else step
        series[position] = last
    return series
