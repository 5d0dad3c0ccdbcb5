import shutil
import subprocess
import sys

import pytest

from labdata.env import CHECKOUT
from tests.jobs.fleet import Fleet

PREPARE = """
import django
django.setup()
from django.conf import settings
from labdata.accounts import first_administrator
from labdata.supervisor.setup import prepare_home
prepare_home(settings.HOME, print)
first_administrator()
"""


@pytest.fixture(scope="session")
def first_home(tmp_path_factory):
    """A home after its first start: schema, static files and one account. Copy it; ``ready_home`` does."""
    home = tmp_path_factory.mktemp("first")
    environment = Fleet(home, settings="labdata.settings").environment
    subprocess.run([sys.executable, "-c", PREPARE], cwd=CHECKOUT, env=environment, check=True)
    return home


@pytest.fixture
def ready_home(first_home, tmp_path):
    """A home of one's own after its first start, in a folder with blanks in its name."""
    return shutil.copytree(first_home, tmp_path / "home with blanks")
