"""Every kind of fault that a rehearsal injects, in the order in which it is told."""

from qc.rehearsal import depths, rock, slips
from qc.rehearsal.kind import Kind

KINDS: tuple[Kind, ...] = (*rock.KINDS, *slips.KINDS, *depths.KINDS)
