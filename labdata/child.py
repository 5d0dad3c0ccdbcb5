"""What runs in a child process: ``python -m labdata.child web PORT`` or ``... worker NUMBER``."""

import os
import signal
import sys
import threading
import time
import warnings
from collections.abc import Callable

FINISH_SECONDS = 1.2  # a running job may end by itself,
INTERRUPT_SECONDS = 1.3  # then it is asked to stop at its next tick,
GIVE_BACK_SECONDS = 0.7  # then its lease is given back
ANSWER_SECONDS = 2.5  # for requests in flight
THREADS = 8


def main(argv: list[str]) -> int:
    """Run the part that ``argv`` names until standard input ends."""
    role, argument = argv
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    os.environ.setdefault("DJANGO_SETTINGS_MODULE", "labdata.settings")
    import django  # noqa: PLC0415

    django.setup()
    return {"web": web, "worker": worker}[role](argument)


def at_end_of_input(stop: Callable[[], None]) -> None:
    """Call ``stop`` in a thread once the supervisor closes our standard input or is gone."""

    def wait() -> None:
        while os.read(0, 4096):  # not sys.stdin: its lock would be held when the interpreter ends
            continue
        stop()

    threading.Thread(target=wait, name="end-of-input", daemon=True).start()


def web(port: str) -> int:
    """Serve pages and API with waitress."""
    from waitress.server import create_server  # noqa: PLC0415

    from labdata.wsgi import application  # noqa: PLC0415

    server = create_server(application, host="127.0.0.1", port=int(port), threads=THREADS, ident="kerogate")

    def stop() -> None:
        server.close()
        server.task_dispatcher.shutdown(timeout=ANSWER_SECONDS)
        os._exit(0)

    at_end_of_input(stop)
    server.run()
    time.sleep(2 * ANSWER_SECONDS)  # the listener is closed; `stop` ends the process when the last answer is out
    return 0


def worker(number: str) -> int:
    """Run jobs one at a time in this process."""
    warnings.filterwarnings("ignore", message=".*superuser privileges.*")
    from labdata.celery import app  # noqa: PLC0415

    at_end_of_input(stop_worker)
    app.worker_main([
        "--quiet", "worker", "--pool=solo", "--concurrency=1", f"--hostname=w{number}.{os.getpid()}@%h", "--loglevel=WARNING",
        "--without-gossip", "--without-mingle", "--without-heartbeat",
    ])  # fmt: skip
    return 0


def stop_worker() -> None:
    """Let the running job end, else interrupt it at its next tick, else give it back; then leave."""
    from celery.worker import state  # noqa: PLC0415

    from labdata.jobs.runner import CURRENT  # noqa: PLC0415

    state.should_stop = 0  # type: ignore[assignment]
    CURRENT.close()
    _until_idle(FINISH_SECONDS)
    if context := CURRENT.context:
        context.interrupted.set()
    _until_idle(INTERRUPT_SECONDS)
    if CURRENT.lease:
        threading.Thread(target=_give_back, daemon=True).start()
        _until_idle(GIVE_BACK_SECONDS)
    os._exit(0)


def _until_idle(seconds: float) -> None:
    """Wait until no job runs in this process, at most ``seconds``."""
    from labdata.jobs.runner import CURRENT  # noqa: PLC0415

    latest = time.monotonic() + seconds
    while CURRENT.lease and time.monotonic() < latest:
        time.sleep(0.02)


def _give_back() -> None:
    """Queue the job again, so that the next worker need not wait for its lease to lapse."""
    from labdata.jobs.context import LeaseLost  # noqa: PLC0415
    from labdata.jobs.runner import CURRENT  # noqa: PLC0415

    lease = CURRENT.lease
    if lease is not None:
        try:
            lease.hand_back("The worker was stopped; the job waits for the next one.")
        except LeaseLost:
            return


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
