"""The Celery application. It carries job ids only; labdata/jobs has the work."""

from typing import Any

import kombu.transport
from celery import Celery
from celery.signals import worker_ready, worker_shutdown
from kombu import Queue

from labdata.env import Environment, read_environment

EMBEDDED_SCHEME = "kerogate"
kombu.transport.TRANSPORT_ALIASES[EMBEDDED_SCHEME] = "labdata.jobs.transport:Transport"


def broker(environment: Environment) -> dict[str, Any]:
    """Broker settings: a file in the home folder unless a URL names Redis or RabbitMQ. Names are per installation."""
    name = f"{environment.installation}.jobs"
    arguments = None
    options: dict[str, Any] = {}
    url = environment.broker_url
    if environment.embedded:
        url, options = f"{EMBEDDED_SCHEME}://file", {"path": str(environment.home / "broker.sqlite3")}
    elif url.startswith("redis"):
        options = {"global_keyprefix": f"{environment.installation}:", "visibility_timeout": 3600}
    elif url.startswith("amqp"):
        options, arguments = {"confirm_publish": True}, {"x-queue-type": "quorum"}
    queue = Queue(name, routing_key=name, queue_arguments=arguments)
    return {
        "broker_url": url, "broker_transport_options": options, "task_default_queue": name, "task_queues": [queue],
        "broker_connection_timeout": 4,
    }  # fmt: skip


app = Celery("kerogate")
app.config_from_object("django.conf:settings", namespace="CELERY")
app.conf.update(broker(read_environment()))
app.autodiscover_tasks(["labdata.jobs"])


@worker_ready.connect
def _start_sweeper(**_: Any) -> None:
    from labdata.jobs.sweeper import Sweeper  # noqa: PLC0415 - models must be loaded first

    app.sweeper = Sweeper()  # type: ignore[attr-defined]
    app.sweeper.start()  # type: ignore[attr-defined]


@worker_shutdown.connect
def _stop_sweeper(**_: Any) -> None:
    if sweeper := getattr(app, "sweeper", None):
        sweeper.stop()
