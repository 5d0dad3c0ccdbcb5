from django.apps import AppConfig
from django.db.models.signals import post_migrate


class LabdataConfig(AppConfig):
    name = "labdata"
    verbose_name = "laboratory data"

    def ready(self) -> None:
        """Make the Celery application current, and seed methods and analytes after every migration."""
        from labdata import celery  # noqa: F401, PLC0415
        from labdata.registry.catalogue import seed  # noqa: PLC0415

        post_migrate.connect(seed, sender=self, dispatch_uid="labdata.catalogue")
