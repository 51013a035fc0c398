from django.apps import AppConfig


class LedgerConfig(AppConfig):
    name = "programme.ledger"
    verbose_name = "Ledger"
