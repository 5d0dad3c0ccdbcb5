"""CPU seconds, and the table of ratios made of them."""

import gc
import statistics
import time
from collections.abc import Callable
from dataclasses import asdict, dataclass, field
from typing import Any

Work = Callable[[], object]


@dataclass
class Measured:
    """One benchmark: the service's own time, and the baselines it is held against [CPU s]."""

    name: str
    work: str
    size: str
    seconds: float
    baselines: dict[str, float] = field(default_factory=dict)
    runs: int = 1
    aims: dict[str, float] = field(default_factory=dict)

    def as_dict(self) -> dict[str, Any]:
        """As ``bench --json`` prints it: the times, and per baseline the ratio and the aim where there is one."""
        ratios = {
            name: {"seconds": round(seconds, 4), "ratio": round(self.seconds / seconds, 3), "aim": self.aims.get(name)}
            for name, seconds in self.baselines.items()
        }
        return {**asdict(self), "seconds": round(self.seconds, 4), "baselines": ratios}


def cpu_seconds(work: Work, runs: int) -> float:
    """Median CPU seconds of ``work`` over ``runs`` runs, garbage collected before each."""
    taken = []
    for _ in range(runs):
        gc.collect()
        start = time.process_time()
        work()
        taken.append(time.process_time() - start)
    return max(statistics.median(taken), 1e-6)


def together(ours: Work, baselines: dict[str, Work], runs: int) -> tuple[float, dict[str, float]]:
    """Medians of our work and of each baseline, taken in turns so that all see the same machine."""
    works = {"": ours, **baselines}
    taken: dict[str, list[float]] = {name: [] for name in works}
    for _ in range(runs):
        for name, work in works.items():
            taken[name].append(cpu_seconds(work, 1))
    medians = {name: statistics.median(seconds) for name, seconds in taken.items()}
    return medians.pop(""), medians
