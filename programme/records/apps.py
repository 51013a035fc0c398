from django.apps import AppConfig


class RecordsConfig(AppConfig):
    name = "programme.records"
    verbose_name = "Records"
