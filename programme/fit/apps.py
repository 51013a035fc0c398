from django.apps import AppConfig


class FitConfig(AppConfig):
    name = "programme.fit"
    verbose_name = "Fit"
