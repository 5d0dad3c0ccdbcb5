#!/usr/bin/env python3
"""The one door: ``python3 manage.py demo`` shows the service, ``python3 manage.py test`` checks it."""

import sys

from labdata import bootstrap

if __name__ == "__main__":
    sys.exit(bootstrap.main(sys.argv))
