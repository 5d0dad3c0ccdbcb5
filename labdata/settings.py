"""Django settings. The same file serves one laboratory on SQLite and an organisation on PostgreSQL."""

import sys
from typing import Any

import dj_database_url
from csp.constants import NONE, SELF

from labdata.env import CHECKOUT, read_environment

ENV = read_environment()
BASE_DIR = CHECKOUT
HOME = ENV.home

SECRET_KEY = ENV.secret_key
DEBUG = ENV.debug
ALLOWED_HOSTS = list(ENV.allowed_hosts) or ["127.0.0.1", "localhost", "[::1]"]
CSRF_TRUSTED_ORIGINS = list(ENV.trusted_origins)

INSTALLED_APPS = [
    "labdata",
    "qc",
    "django.contrib.auth",
    "django.contrib.contenttypes",
    "django.contrib.sessions",
    "django.contrib.messages",
    "django.contrib.staticfiles",
    "django_htmx",
    "django_filters",
    "rest_framework",
    "drf_spectacular",
]

MIDDLEWARE = [
    "django.middleware.security.SecurityMiddleware",
    "whitenoise.middleware.WhiteNoiseMiddleware",
    "csp.middleware.CSPMiddleware",
    "django.contrib.sessions.middleware.SessionMiddleware",
    "django.middleware.common.CommonMiddleware",
    "django.middleware.csrf.CsrfViewMiddleware",
    "django.contrib.auth.middleware.AuthenticationMiddleware",
    "django.contrib.auth.middleware.LoginRequiredMiddleware",
    "django.contrib.messages.middleware.MessageMiddleware",
    "django.middleware.clickjacking.XFrameOptionsMiddleware",
    "django_htmx.middleware.HtmxMiddleware",
    "labdata.pages.refusals.RefusalMiddleware",
]

ROOT_URLCONF = "labdata.urls"
WSGI_APPLICATION = "labdata.wsgi.application"

TEMPLATES = [
    {
        "BACKEND": "django.template.backends.django.DjangoTemplates",
        "DIRS": [BASE_DIR / "templates"],
        "APP_DIRS": True,
        "OPTIONS": {
            "context_processors": [
                "django.template.context_processors.request",
                "django.contrib.auth.context_processors.auth",
                "django.contrib.messages.context_processors.messages",
                "labdata.context.workplace",
            ],
        },
    },
]

SQLITE_OPTIONS: dict[str, Any] = {
    "timeout": 20,
    "transaction_mode": "IMMEDIATE",
    "init_command": (
        "PRAGMA journal_mode=WAL;PRAGMA synchronous=NORMAL;PRAGMA recursive_triggers=ON;"
        "PRAGMA journal_size_limit=67108864;"
    ),
}


def _database() -> dict[str, Any]:
    """PostgreSQL from DATABASE_URL, else one SQLite file in the home folder."""
    if ENV.database_url:
        return dict(dj_database_url.parse(ENV.database_url, conn_max_age=60, conn_health_checks=True))
    return {
        "ENGINE": "django.db.backends.sqlite3",
        "NAME": str(HOME / "kerogate.sqlite3"),
        "OPTIONS": SQLITE_OPTIONS,
        # a file, not memory: triggers, WAL and second processes are part of what the tests exercise
        "TEST": {"NAME": str(HOME / "test.sqlite3")},
    }


DATABASES = {"default": _database()}
DEFAULT_AUTO_FIELD = "django.db.models.BigAutoField"

AUTH_PASSWORD_VALIDATORS = [
    {"NAME": "django.contrib.auth.password_validation.UserAttributeSimilarityValidator"},
    {"NAME": "django.contrib.auth.password_validation.MinimumLengthValidator", "OPTIONS": {"min_length": 10}},
    {"NAME": "django.contrib.auth.password_validation.CommonPasswordValidator"},
]
LOGIN_URL = "login"
LOGIN_REDIRECT_URL = "home"
LOGOUT_REDIRECT_URL = "login"

LANGUAGE_CODE = "en-gb"
TIME_ZONE = "UTC"
USE_I18N = False
USE_TZ = True

STATIC_URL = "/static/"
STATIC_ROOT = HOME / "static"
MEDIA_ROOT = HOME / "files"

_FILES: dict[str, Any] = {
    "BACKEND": "django.core.files.storage.FileSystemStorage",
    "OPTIONS": {"location": str(MEDIA_ROOT)},
}
if ENV.s3_bucket:
    _FILES = {"BACKEND": "storages.backends.s3.S3Storage", "OPTIONS": {"bucket_name": ENV.s3_bucket}}
STORAGES = {
    "default": _FILES,
    "staticfiles": {"BACKEND": "whitenoise.storage.CompressedManifestStaticFilesStorage"},
}
if "pytest" in sys.modules:
    STORAGES["staticfiles"] = {"BACKEND": "django.contrib.staticfiles.storage.StaticFilesStorage"}
    WHITENOISE_USE_FINDERS = True
    WHITENOISE_AUTOREFRESH = True

DATA_UPLOAD_MAX_MEMORY_SIZE = 64 * 1024 * 1024
DATA_UPLOAD_MAX_NUMBER_FIELDS = 200_000

CONTENT_SECURITY_POLICY = {
    "DIRECTIVES": {
        "default-src": [NONE],
        "script-src": [SELF],
        "style-src": [SELF],
        "img-src": [SELF, "data:"],
        "connect-src": [SELF],
        "font-src": [SELF],
        "form-action": [SELF],
        "base-uri": [NONE],
        "frame-ancestors": [NONE],
    }
}
X_FRAME_OPTIONS = "DENY"
SECURE_REFERRER_POLICY = "same-origin"
SESSION_COOKIE_HTTPONLY = True
SESSION_COOKIE_SAMESITE = "Lax"
SESSION_COOKIE_SECURE = CSRF_COOKIE_SECURE = ENV.https
SECURE_SSL_REDIRECT = ENV.https
SECURE_REDIRECT_EXEMPT = [r"^healthz$"]  # load balancers ask over plain HTTP
SECURE_HSTS_SECONDS = 31_536_000 if ENV.https else 0
if ENV.https:
    SECURE_PROXY_SSL_HEADER = ("HTTP_X_FORWARDED_PROTO", "https")

REST_FRAMEWORK = {
    "DEFAULT_AUTHENTICATION_CLASSES": [
        "labdata.api.authentication.TokenAuthentication",
        "rest_framework.authentication.SessionAuthentication",
    ],
    "DEFAULT_PERMISSION_CLASSES": ["labdata.api.permissions.MembershipPermission"],
    "DEFAULT_RENDERER_CLASSES": ["rest_framework.renderers.JSONRenderer"],
    "DEFAULT_FILTER_BACKENDS": ["django_filters.rest_framework.DjangoFilterBackend"],
    "DEFAULT_PAGINATION_CLASS": "labdata.api.pagination.ByIdCursor",
    "DEFAULT_SCHEMA_CLASS": "drf_spectacular.openapi.AutoSchema",
    "EXCEPTION_HANDLER": "labdata.api.problems.problem_response",
    "PAGE_SIZE": 200,
}
SPECTACULAR_SETTINGS = {
    "TITLE": "Kerogate",
    "DESCRIPTION": "Laboratory data of core and cuttings: registry, QC, review and immutable releases.",
    "VERSION": "1",
    "OAS_VERSION": "3.1.0",
    "SERVE_INCLUDE_SCHEMA": False,
    "SERVE_PERMISSIONS": ["rest_framework.permissions.AllowAny"],
    "ENUM_NAME_OVERRIDES": {
        "JobState": "labdata.models.JobState",
        "ReviewSetState": "qc.models.ReviewSetState",
        "Verdict": "qc.models.Verdict",
    },
    "POSTPROCESSING_HOOKS": [
        "drf_spectacular.hooks.postprocess_schema_enums",
        "labdata.api.schema.with_problems",
    ],
}

# Celery carries job ids; the database owns the jobs (labdata/jobs). The broker is named in labdata/celery.py.
CELERY_TASK_IGNORE_RESULT = True
CELERY_RESULT_BACKEND = None
CELERY_TASK_ACKS_LATE = False
CELERY_WORKER_PREFETCH_MULTIPLIER = 1
CELERY_TASK_SERIALIZER = "json"
CELERY_ACCEPT_CONTENT = ["json"]
CELERY_TASK_PUBLISH_RETRY = False
CELERY_BROKER_CONNECTION_RETRY_ON_STARTUP = True
CELERY_WORKER_ENABLE_REMOTE_CONTROL = False
CELERY_WORKER_SEND_TASK_EVENTS = False
CELERY_WORKER_HIJACK_ROOT_LOGGER = False
JOB_LEASE_SECONDS = ENV.lease_seconds
JOB_SWEEP_SECONDS = ENV.sweep_seconds

LOGGING = {
    "version": 1,
    "disable_existing_loggers": False,
    "formatters": {"line": {"format": "%(asctime)s %(levelname)s %(name)s: %(message)s"}},
    "handlers": {"stderr": {"class": "logging.StreamHandler", "formatter": "line"}},
    "root": {"handlers": ["stderr"], "level": "WARNING"},
}
