from django.apps import AppConfig


class SelectionConfig(AppConfig):
    name = "programme.selection"
    verbose_name = "Selection"
