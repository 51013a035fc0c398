"""One settings file; everything that differs between machines comes from the environment.

A wrong value stops the start and names the variable, what it held and what it may hold.
"""

import os
from pathlib import Path

import dj_database_url
from csp.constants import NONE, SELF
from django.core.exceptions import ImproperlyConfigured

BASE_DIR = Path(__file__).resolve().parent.parent
VAR_DIR = Path(os.environ.get("HALEWARD_VAR", BASE_DIR / "var"))
FIXTURES_DIR = BASE_DIR / "fixtures"


def _switch(name: str, *, default: bool) -> bool:
    text = os.environ.get(name, "1" if default else "0").strip().lower()
    if text in {"1", "true", "yes", "on"}:
        return True
    if text in {"0", "false", "no", "off"}:
        return False
    raise ImproperlyConfigured(f"{name}: {text!r} is not allowed; it may be 1 or 0")


def _words(name: str, default: str = "") -> list[str]:
    return [word.strip() for word in os.environ.get(name, default).split(",") if word.strip()]


DEBUG = _switch("HALEWARD_DEBUG", default=False)
# Plain HTTP is for a demo or a test on one machine; a real site stands behind TLS.
IS_PLAIN_HTTP = _switch("HALEWARD_PLAIN_HTTP", default=False)

SECRET_KEY = os.environ.get("HALEWARD_SECRET_KEY", "")
if not SECRET_KEY:
    if not (DEBUG or IS_PLAIN_HTTP):
        raise ImproperlyConfigured(
            "HALEWARD_SECRET_KEY: empty; it must be at least 50 random characters "
            "(or set HALEWARD_PLAIN_HTTP=1 for a demo on this machine only)"
        )
    SECRET_KEY = "only-for-a-demo-on-this-machine-" + "0" * 24

ALLOWED_HOSTS = _words("HALEWARD_ALLOWED_HOSTS", "localhost,127.0.0.1,[::1]")
CSRF_TRUSTED_ORIGINS = _words("HALEWARD_TRUSTED_ORIGINS")

INSTALLED_APPS = [
    "django.contrib.auth",
    "django.contrib.contenttypes",
    "django.contrib.sessions",
    "django.contrib.messages",
    "whitenoise.runserver_nostatic",
    "django.contrib.staticfiles",
    "django.contrib.humanize",
    "django_htmx",
    "crispy_forms",
    "allauth",
    "allauth.account",
    "allauth.mfa",
    "programme",
    "programme.ledger",
    "programme.roster",
    "exposure",
    "programme.equipment",
    "programme.fit",
    "programme.selection",
    "programme.records",
]

MIDDLEWARE = [
    "django.middleware.security.SecurityMiddleware",
    "whitenoise.middleware.WhiteNoiseMiddleware",
    "django.middleware.gzip.GZipMiddleware",
    "csp.middleware.CSPMiddleware",
    "django.contrib.sessions.middleware.SessionMiddleware",
    "django.middleware.common.CommonMiddleware",
    "django.middleware.csrf.CsrfViewMiddleware",
    "django.contrib.auth.middleware.AuthenticationMiddleware",
    "allauth.account.middleware.AccountMiddleware",
    "django.contrib.auth.middleware.LoginRequiredMiddleware",
    "django.contrib.messages.middleware.MessageMiddleware",
    "django.middleware.clickjacking.XFrameOptionsMiddleware",
    "django_htmx.middleware.HtmxMiddleware",
    "programme.roster.middleware.PersonalPagesAreNotStored",
]

ROOT_URLCONF = "programme.urls"
WSGI_APPLICATION = "programme.wsgi.application"

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
                "programme.roster.context.site_and_nav",
            ],
        },
    },
]

DATABASE_URL = os.environ.get("DATABASE_URL", "")
if DATABASE_URL:
    DATABASES = {"default": dj_database_url.parse(DATABASE_URL, conn_max_age=60)}
    DATABASES["default"]["CONN_HEALTH_CHECKS"] = True
else:
    DATABASES = {
        "default": {
            "ENGINE": "django.db.backends.sqlite3",
            "NAME": VAR_DIR / "haleward.sqlite3",
            "OPTIONS": {
                "transaction_mode": "IMMEDIATE",
                "timeout": 20,
                # FULL: what the page called saved survives a power cut.
                "init_command": "PRAGMA journal_mode=WAL;PRAGMA synchronous=FULL;",
            },
        }
    }
DEFAULT_AUTO_FIELD = "django.db.models.BigAutoField"

# Sign-in slow-down counts here, so that it holds over several processes.
CACHES = {
    "default": {
        "BACKEND": "django.core.cache.backends.db.DatabaseCache",
        "LOCATION": "haleward_cache",
    }
}

AUTHENTICATION_BACKENDS = ["allauth.account.auth_backends.AuthenticationBackend"]
AUTH_PASSWORD_VALIDATORS = [
    {
        "NAME": "django.contrib.auth.password_validation.MinimumLengthValidator",
        "OPTIONS": {"min_length": 9},
    },
    {"NAME": "django.contrib.auth.password_validation.CommonPasswordValidator"},
]
LOGIN_URL = "account_login"
LOGIN_REDIRECT_URL = "/"
ACCOUNT_LOGIN_METHODS = {"username"}
ACCOUNT_SIGNUP_FIELDS = ["username*", "password1*", "password2*"]
ACCOUNT_EMAIL_VERIFICATION = "none"
ACCOUNT_ADAPTER = "programme.roster.adapter.ClosedDoor"
ACCOUNT_LOGOUT_REDIRECT_URL = "account_login"
ACCOUNT_SESSION_REMEMBER = False
MFA_SUPPORTED_TYPES = ["totp", "recovery_codes"]

ACCOUNT_PREVENT_ENUMERATION = True
# Nothing is mailed unless a mail server is named.
EMAIL_HOST = os.environ.get("HALEWARD_MAIL_HOST", "")
EMAIL_BACKEND = f"django.core.mail.backends.{'smtp' if EMAIL_HOST else 'dummy'}.EmailBackend"

SESSION_COOKIE_AGE = 12 * 3600
SESSION_EXPIRE_AT_BROWSER_CLOSE = True
SESSION_COOKIE_HTTPONLY = True
SESSION_COOKIE_SAMESITE = "Lax"
CSRF_COOKIE_HTTPONLY = True
CSRF_COOKIE_SAMESITE = "Lax"
if not IS_PLAIN_HTTP and not DEBUG:
    SESSION_COOKIE_NAME = "__Host-sessionid"
    CSRF_COOKIE_NAME = "__Host-csrftoken"
    SESSION_COOKIE_SECURE = CSRF_COOKIE_SECURE = True
    SECURE_SSL_REDIRECT = True
    SECURE_HSTS_SECONDS = 31_536_000
    SECURE_HSTS_INCLUDE_SUBDOMAINS = True
    SECURE_HSTS_PRELOAD = True
    if _switch("HALEWARD_BEHIND_PROXY", default=True):
        SECURE_PROXY_SSL_HEADER = ("HTTP_X_FORWARDED_PROTO", "https")
SECURE_REFERRER_POLICY = "same-origin"
X_FRAME_OPTIONS = "DENY"
CONTENT_SECURITY_POLICY = {
    "DIRECTIVES": {
        "default-src": [SELF],
        "script-src": [SELF],
        "style-src": [SELF],
        "img-src": [SELF, "data:"],
        "object-src": [NONE],
        "base-uri": [NONE],
        "form-action": [SELF],
        "frame-ancestors": [NONE],
    }
}

LANGUAGE_CODE = "en-gb"
TIME_ZONE = "UTC"
USE_TZ = True
# A localised number form reads 1.234 as 1234 in some languages: measured inputs never are.
USE_I18N = False

STATIC_URL = "/static/"
STATICFILES_DIRS = [BASE_DIR / "static"]
STATIC_ROOT = Path(os.environ.get("HALEWARD_STATIC", BASE_DIR / "static_collected"))
STORAGES = {
    "default": {"BACKEND": "django.core.files.storage.FileSystemStorage"},
    "staticfiles": {
        "BACKEND": "django.contrib.staticfiles.storage.StaticFilesStorage"
        if DEBUG or os.environ.get("HALEWARD_TESTING")
        else "whitenoise.storage.CompressedManifestStaticFilesStorage"
    },
}
WHITENOISE_USE_FINDERS = bool(os.environ.get("HALEWARD_TESTING")) or DEBUG

CRISPY_ALLOWED_TEMPLATE_PACKS = ["house"]
CRISPY_TEMPLATE_PACK = "house"
CRISPY_FAIL_SILENTLY = False

DATA_UPLOAD_MAX_NUMBER_FIELDS = 4000
FILE_UPLOAD_MAX_MEMORY_SIZE = 2_621_440
# Enforced by the import page before anything is read; see programme/records/intake.
IMPORT_MAX_BYTES = 20 * 1024 * 1024

LOGGING = {
    "version": 1,
    "disable_existing_loggers": False,
    "handlers": {"console": {"class": "logging.StreamHandler"}},
    "root": {"handlers": ["console"], "level": "WARNING"},
}
