"""Names folded for matching. They live with the reader, since a file's wells are matched before anything is stored."""

from labdata.intake.names import name_key, uwi_key

__all__ = ["name_key", "uwi_key"]
