"""How headless Chromium is started."""

import os

CHROMIUM = os.environ.get("KEROGATE_CHROMIUM", "/usr/bin/chromium")
FLAGS = [
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
    "--disable-component-update", "--disable-sync",
]  # fmt: skip
WIDE = {"width": 1440, "height": 900}
