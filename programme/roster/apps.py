from django.apps import AppConfig


class RosterConfig(AppConfig):
    name = "programme.roster"
    verbose_name = "Roster"
