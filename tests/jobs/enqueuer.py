"""``python -m tests.jobs.enqueuer COUNT SECONDS``: ask for COUNT probes, one transaction each, as a web process would."""

import sys
import time

import django

django.setup()

from django.db import transaction  # noqa: E402

from labdata.jobs import enqueue  # noqa: E402

if __name__ == "__main__":
    count, seconds = int(sys.argv[1]), float(sys.argv[2])
    for number in range(count):
        with transaction.atomic():
            enqueue("probe", {"seconds": seconds}, project=None, user=None, idem_key=f"probe-{number}")
        time.sleep(0.02)
