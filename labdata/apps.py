from django.apps import AppConfig


class LabdataConfig(AppConfig):
    name = "labdata"
    verbose_name = "laboratory data"

    def ready(self) -> None:
        """Make the Celery application current, so that shared tasks belong to it in every process."""
        from labdata import celery  # noqa: F401, PLC0415
