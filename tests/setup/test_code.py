"""The code as a whole: formatted, linted, typed, and no model change without its migration."""

import subprocess
import sys

import pytest
from django.core.management import call_command

from labdata.env import CHECKOUT


@pytest.mark.parametrize("words", [
    ["ruff", "format", "--check", "--quiet", "."],
    ["ruff", "check", "--no-fix", "."],
    ["mypy", "labdata", "qc"],
], ids=lambda words: " ".join(words[:2]))  # fmt: skip
def test_tools_find_nothing(words, tmp_path):
    cache = ["--cache-dir", str(tmp_path)]
    done = subprocess.run(
        [sys.executable, "-m", *words, *cache], cwd=CHECKOUT, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stdout + done.stderr


@pytest.mark.django_db
def test_every_model_change_has_its_migration():
    call_command("makemigrations", "--check", "--dry-run", verbosity=0)
