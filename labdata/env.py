"""The environment, read once and typed. Nothing else in the project reads ``os.environ`` for settings."""

import os
import secrets
from dataclasses import dataclass
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parent.parent


@dataclass(frozen=True)
class Environment:
    """What the outside may set; contract and defaults in README.md, "Production"."""

    home: Path
    database_url: str
    broker_url: str
    secret_key: str
    allowed_hosts: tuple[str, ...]
    trusted_origins: tuple[str, ...]
    debug: bool
    https: bool
    installation: str
    lease_seconds: float
    sweep_seconds: float
    s3_bucket: str

    @property
    def embedded(self) -> bool:
        """True when no broker is named: SQLite broker file and solo workers."""
        return not self.broker_url


def _words(name: str) -> tuple[str, ...]:
    return tuple(word.strip() for word in os.environ.get(name, "").split(",") if word.strip())


def _flag(name: str) -> bool:
    return os.environ.get(name, "").strip().lower() in {"1", "true", "yes", "on"}


def _secret_key(home: Path) -> str:
    """The key from SECRET_KEY, else one made once and kept in the home folder, readable by the owner only."""
    if given := os.environ.get("SECRET_KEY", ""):
        return given
    home.mkdir(parents=True, exist_ok=True)
    path = home / "secret_key"
    try:
        handle = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600)
    except FileExistsError:
        return path.read_text().strip()
    with os.fdopen(handle, "w") as stream:
        stream.write(secrets.token_urlsafe(50))
    return path.read_text().strip()


def read_environment() -> Environment:
    """Read every setting that the environment may give."""
    home = Path(os.environ.get("KEROGATE_HOME") or CHECKOUT / "var").expanduser().resolve()
    return Environment(
        home=home,
        database_url=os.environ.get("DATABASE_URL", ""),
        broker_url=os.environ.get("CELERY_BROKER_URL", ""),
        secret_key=_secret_key(home),
        allowed_hosts=_words("ALLOWED_HOSTS"),
        trusted_origins=_words("CSRF_TRUSTED_ORIGINS"),
        debug=_flag("KEROGATE_DEBUG"),
        https=_flag("KEROGATE_HTTPS"),
        installation=os.environ.get("KEROGATE_INSTALLATION", "kerogate"),
        lease_seconds=float(os.environ.get("KEROGATE_LEASE", "60")),
        sweep_seconds=float(os.environ.get("KEROGATE_SWEEP", "10")),
        s3_bucket=os.environ.get("KEROGATE_S3_BUCKET", ""),
    )
