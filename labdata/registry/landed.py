"""What came of storing a file, for the rooms after the registry."""

from dataclasses import dataclass, field

from labdata.models import Report, Upload


@dataclass
class Landed:
    """``report`` is None when nothing landed. Pairs of result ids are (old, new).

    ``unchanged``: a later report version repeats the value; ``changed``: it gives another; ``withdrawn``: it lacks it.
    ``replaced_analyses``: new analysis id -> id of the analysis that it replaces.
    """

    upload: Upload
    report: Report | None = None
    analysis_ids: list[int] = field(default_factory=list)
    well_ids: list[int] = field(default_factory=list)
    unchanged: list[tuple[int, int]] = field(default_factory=list)
    changed: list[tuple[int, int]] = field(default_factory=list)
    withdrawn: list[int] = field(default_factory=list)
    replaced_analyses: dict[int, int] = field(default_factory=dict)
