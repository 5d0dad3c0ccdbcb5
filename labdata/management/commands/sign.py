"""Signing a review set from the command line, with the password again."""

import getpass
import os
import sys
from typing import Any

from django.core.management.base import CommandParser

from labdata.access import Action, find_project, find_user, require
from labdata.errors import NotFound, WrongPassword
from labdata.management.commands._base import ServiceCommand
from qc.models import ReviewSet
from qc.review.services import MEANINGS, sign_off


class Command(ServiceCommand):
    help = "sign a review set; the password comes from the terminal or KEROGATE_PASSWORD"

    def arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--project", required=True, metavar="SLUG")
        parser.add_argument("--review-set", required=True, type=int, metavar="ID")
        parser.add_argument("--user", required=True, metavar="NAME", help="who signs")
        parser.add_argument(
            "--meaning", default="reviewed", help=f"one of {', '.join(MEANINGS)}, or your own words (default: reviewed)"
        )

    def answer(self, **options: Any) -> dict[str, Any]:
        project, user = find_project(options["project"]), find_user(options["user"])
        require(user, project, Action.SIGN)
        review_set = project.review_sets.filter(pk=options["review_set"]).first()
        if review_set is None:
            known = ", ".join(f"{held.pk} ({held})" for held in ReviewSet.objects.filter(project=project)[:20])
            raise NotFound(
                f"Project «{project.slug}» has no review set {options['review_set']}.",
                remedy=f"Review sets: {known or 'none yet'}.",
                review_set=options["review_set"],
            )
        record = sign_off(
            user=user, review_set=review_set, password=self._password(user.get_username()), meaning=options["meaning"]
        )
        return {
            "sign_off": record.pk, "review_set": review_set.pk, "well": review_set.well.name, "number": review_set.number,
            "signed_by": record.signer_name, "signed_at": record.signed_at, "meaning": record.meaning,
            "content_sha256": record.content_sha256, "counts": record.counts,
        }  # fmt: skip

    def _password(self, name: str) -> str:
        given = os.environ.get("KEROGATE_PASSWORD")
        if given is not None:
            return given
        if not sys.stdin.isatty():
            raise WrongPassword("No password was given.", remedy="Set KEROGATE_PASSWORD, or run from a terminal.")
        return getpass.getpass(f"Password of {name}: ")

    def show(self, answer: dict[str, Any]) -> None:
        counts = answer["counts"]
        self.stdout.write(
            f"{answer['well']} set {answer['number']} signed by {answer['signed_by']} at {answer['signed_at']:%Y-%m-%d %H:%M} UTC: "
            f"{counts['accepted']} accepted, {counts['rejected']} rejected.\n{answer['meaning']}\nseal {answer['content_sha256']}"
        )
