"""``manage.py test``: all set-up and the whole test suite; further words go to pytest as they are."""

import sys

from django.conf import settings
from django.core.management.base import BaseCommand


class Command(BaseCommand):
    help = "Install what the tests need, start private servers, run all tests (or those that pytest arguments name)."

    def run_from_argv(self, argv: list[str]) -> None:
        """Take all words for pytest's, but for --home, which manage.py has read, and --json."""
        from tests.setup.run import run  # noqa: PLC0415 - tests are no part of an installed service

        sys.exit(run(own_words_off(argv[2:]), settings.HOME, as_json="--json" in argv))


def own_words_off(words: list[str]) -> list[str]:
    """``words`` without ``--home DIR``, ``--home=DIR`` and ``--json``."""
    kept, skip = [], False
    for word in words:
        if skip:
            skip = False
        elif word == "--home":
            skip = True
        elif word != "--json" and not word.startswith("--home="):
            kept.append(word)
    return kept
