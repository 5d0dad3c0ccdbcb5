"""What several nouns share."""

from django.db import models


class Choices(models.TextChoices):
    """Text choices whose check constraint is made in one place."""

    @classmethod
    def constraint(cls, field: str, name: str) -> models.CheckConstraint:
        """A database constraint: ``field`` holds one of the values."""
        return models.CheckConstraint(condition=models.Q(**{f"{field}__in": cls.values}), name=name)


class Qualifier(Choices):
    """How the number stands to the truth; never dropped on the way (design: ``<0.05`` is not 0.05)."""

    NONE = "", "as measured"
    BELOW = "<", "below"
    ABOVE = ">", "above"
    ABOUT = "~", "about"
