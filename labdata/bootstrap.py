"""Set-up on a bare machine, with nothing but Python itself: imports no library and no Django."""

import os


def main(argv: list[str]) -> int:
    """Run the command of ``argv`` with the locked dependencies. Returns the exit status."""
    take_home(argv)
    os.environ.setdefault("DJANGO_SETTINGS_MODULE", "labdata.settings")
    from django.core.management import execute_from_command_line  # noqa: PLC0415

    execute_from_command_line(argv)
    return 0


def take_home(argv: list[str]) -> None:
    """Put ``--home DIR`` into KEROGATE_HOME: settings are read before a command sees its arguments."""
    for position, word in enumerate(argv):
        if word == "--home" and position + 1 < len(argv):
            os.environ["KEROGATE_HOME"] = argv[position + 1]
        elif word.startswith("--home="):
            os.environ["KEROGATE_HOME"] = word.removeprefix("--home=")
