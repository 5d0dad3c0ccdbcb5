"""The Celery application. It carries job ids only; labdata/jobs has the work."""

from celery import Celery

app = Celery("kerogate")
app.config_from_object("django.conf:settings", namespace="CELERY")
app.autodiscover_tasks(["labdata.jobs"])
