"""What other rooms call: everything that changes a review set. Each is one transaction with its audit record."""

from qc.review.arrival import take_in
from qc.review.choices import Choice
from qc.review.deciding import accept_unflagged, answer_flag, answer_flags, decide, undo, unflagged_choices
from qc.review.signing import MEANINGS, reopen, sign_off

__all__ = [
    "MEANINGS", "Choice", "accept_unflagged", "answer_flag", "answer_flags", "decide", "reopen", "sign_off",
    "take_in", "undo", "unflagged_choices",
]  # fmt: skip
