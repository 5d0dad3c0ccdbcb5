"""The Quillane Basin, which does not exist: its formations, wells, laboratories and people.

Plain data. How rock properties follow from it is in geology.py. Depths are metres measured depth below the
well's datum unless a name says otherwise.
"""

from dataclasses import dataclass, field

from labdata.models import DatumKind, MudKind, Role, SampleKind

SEED = 20_261_201
PROJECT_SLUG = "demo"
PROJECT_NAME = "Quillane Basin source rock study"


@dataclass(frozen=True)
class Formation:
    """One genetically uniform unit: its kerogen, richness and mineral make-up.

    ``toc_median`` [wt%] and ``toc_sigma`` describe a log-normal; ``hi0`` and ``oi0`` [mg/g TOC] are the immature
    kerogen's; ``retention`` [mg HC/g rock] is what the matrix can hold back from S2; carbonate [wt%]; ``clay`` is
    the share of clay in the rest of the rock.
    """

    name: str
    kerogen: str
    toc_median: float
    toc_sigma: float
    hi0: float
    oi0: float
    retention: float
    carbonate: float
    carbonate_sd: float
    clay: float


AMBREL = Formation("Ambrel Sandstone", "III", 0.62, 0.45, 130.0, 80.0, 0.04, 5.0, 3.0, 0.25)
CORVANE = Formation("Corvane Shale", "II", 1.55, 0.70, 430.0, 32.0, 1.20, 8.0, 4.0, 0.72)
DUNMARROW = Formation("Dunmarrow Limestone", "II/III", 0.48, 0.40, 260.0, 70.0, 0.02, 78.0, 8.0, 0.60)
HESTWICK = Formation("Hestwick Shale", "II", 4.20, 0.42, 560.0, 15.0, 0.05, 14.0, 5.0, 0.55)
OSTRIN = Formation("Ostrin Formation", "III", 1.90, 0.45, 175.0, 30.0, 0.10, 4.0, 2.5, 0.50)
FORMATIONS = {unit.name: unit for unit in (AMBREL, CORVANE, DUNMARROW, HESTWICK, OSTRIN)}


@dataclass(frozen=True)
class Mud:
    """The drilling fluid between two depths."""

    top: float
    base: float
    kind: MudKind
    additives: str = ""


@dataclass(frozen=True)
class Core:
    """One core run in driller's depth."""

    number: int
    top: float
    base: float
    recovered: float
    shift_to_log: float


@dataclass(frozen=True)
class DemoWell:
    """One well: where it is, what it went through, and how it was sampled.

    ``tops`` are (formation, depth); ``survey`` stations are (depth, inclination, azimuth), empty for a vertical
    well; ``casing`` is (depth, diameter in inches).
    """

    name: str
    prefix: str
    uwi: str
    aliases: tuple[str, ...]
    operator: str
    latitude: float
    longitude: float
    datum_elevation: float
    ground_elevation: float
    td: float
    tops: tuple[tuple[Formation, float], ...]
    casing: tuple[tuple[float, float], ...]
    muds: tuple[Mud, ...]
    cores: tuple[Core, ...] = ()
    survey: tuple[tuple[float, float, float], ...] = ()
    datum: DatumKind = DatumKind.KELLY_BUSHING
    country: str = "Norrowland"
    field: str = field(default="")


TARROW_1 = DemoWell(
    "Tarrow 1", "T1", "QB-0017-01", ("Tarrow-1", "TARROW No.1"), "Ellanmoor Energy", 41.3127, -38.2046, 31.4, 24.2,
    2760.0,
    tops=((AMBREL, 1100.0), (CORVANE, 1440.0), (DUNMARROW, 1760.0), (HESTWICK, 2010.0), (OSTRIN, 2440.0)),
    casing=((420.0, 13.375), (1435.0, 9.625), (2520.0, 7.0)),
    muds=(
        Mud(0.0, 1435.0, MudKind.WATER, "bentonite"),
        Mud(1435.0, 2520.0, MudKind.WATER, "KCl, polymer"),
        Mud(2520.0, 2760.0, MudKind.OIL, "mineral base oil"),
    ),
)  # fmt: skip
TARROW_2 = DemoWell(
    "Tarrow 2", "T2", "QB-0017-02", ("Tarrow-2",), "Ellanmoor Energy", 41.3384, -38.1711, 29.8, 22.9, 2480.0,
    tops=((AMBREL, 1210.0), (CORVANE, 1530.0), (DUNMARROW, 1822.0), (HESTWICK, 2041.0), (OSTRIN, 2330.0)),
    casing=((400.0, 13.375), (1500.0, 9.625)),
    muds=(Mud(0.0, 2480.0, MudKind.WATER, "KCl, polymer"),),
    survey=(
        (0.0, 0.0, 0.0), (600.0, 0.0, 64.0), (690.0, 9.0, 64.5), (780.0, 18.0, 65.1), (870.0, 27.0, 65.0),
        (920.0, 32.0, 65.2), (1400.0, 32.4, 65.6), (1900.0, 31.8, 66.1), (2480.0, 31.1, 66.4),
    ),
)  # fmt: skip
FENNICK_1 = DemoWell(
    "Fennick 1", "F1", "QB-0022-01", ("Fennick-1",), "Ellanmoor Energy", 41.2205, -38.3318, 27.5, 20.6, 2310.0,
    tops=((AMBREL, 980.0), (CORVANE, 1302.0), (DUNMARROW, 1644.0), (HESTWICK, 1905.0), (OSTRIN, 2262.0)),
    casing=((380.0, 13.375), (1290.0, 9.625)),
    muds=(Mud(0.0, 2310.0, MudKind.WATER, "KCl, polymer, lignite"),),
    cores=(Core(1, 1452.0, 1479.0, 26.4, 0.9), Core(2, 2102.0, 2129.0, 27.0, 1.3), Core(3, 2129.0, 2156.0, 25.2, 1.3)),
)  # fmt: skip
SALLOWBY_1 = DemoWell(
    "Sallowby 1", "SA", "QB-0031-01", ("Sallowby-1",), "Merrowdale Petroleum", 41.0871, -38.4902, 33.0, 25.7, 2890.0,
    tops=((AMBREL, 1380.0), (CORVANE, 1700.0), (DUNMARROW, 2030.0), (HESTWICK, 2260.0), (OSTRIN, 2620.0)),
    casing=((450.0, 13.375), (1680.0, 9.625)),
    muds=(Mud(0.0, 2890.0, MudKind.WATER, "KCl, polymer; cellulose fibre pill at 2210 m"),),
)  # fmt: skip
WELLS = (TARROW_1, TARROW_2, FENNICK_1, SALLOWBY_1)


@dataclass(frozen=True)
class DemoLaboratory:
    """A laboratory with its repeatability: relative standard deviation and floor per measured quantity."""

    name: str
    address: str
    repeatability: tuple[tuple[str, float, float], ...]


BRACKWATER = DemoLaboratory(
    "Brackwater Rock Laboratory", "4 Kiln Lane, Brackwater, Norrowland",
    (("toc", 0.02, 0.01), ("s1", 0.05, 0.005), ("s2", 0.025, 0.02), ("s3", 0.06, 0.02), ("carb", 0.02, 0.4)),
)  # fmt: skip
NINEFOLD = DemoLaboratory(
    "Ninefold Analytical", "Shed 9, Old Rope Works, Port Anselm, Norrowland",
    (("toc", 0.03, 0.015), ("s1", 0.07, 0.01), ("s2", 0.035, 0.03), ("s3", 0.08, 0.03), ("carb", 0.03, 0.6)),
)  # fmt: skip
LABORATORIES = (BRACKWATER, NINEFOLD)

# account, role, first name, last name
PEOPLE = (
    ("coordinator", Role.COORDINATOR, "Ilka", "Morrand"),
    ("analyst", Role.ANALYST, "Pell", "Oakhanger"),
    ("geochemist", Role.GEOCHEMIST, "Suvi", "Tarrant-Leigh"),
    ("approver", Role.APPROVER, "Anders", "Quoyle"),
    ("interpreter", Role.INTERPRETER, "Noor", "Hallgarth"),
    ("administrator", Role.ADMINISTRATOR, "Bram", "Wexcombe"),
)


@dataclass(frozen=True)
class Sampling:
    """Samples of one kind taken from ``top`` every ``step`` metres, each ``length`` long (0: a point)."""

    well: DemoWell
    kind: SampleKind
    top: float
    base: float
    step: float
    length: float


FOOT = 0.3048
CUTTINGS = SampleKind.CUTTINGS
SAMPLING = (
    Sampling(TARROW_1, CUTTINGS, 1200.0, 2700.0, 10.0, 10.0),
    Sampling(TARROW_2, CUTTINGS, 4500 * FOOT, 8100 * FOOT, 40 * FOOT, 40 * FOOT),
    Sampling(FENNICK_1, SampleKind.PLUG, 1452.3, 1478.3, 1.31, 0.0),
    Sampling(FENNICK_1, SampleKind.PLUG, 2102.4, 2154.0, 0.87, 0.0),
    Sampling(SALLOWBY_1, CUTTINGS, 1420.0, 2860.0, 20.0, 20.0),
)
