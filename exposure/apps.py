from django.apps import AppConfig


class ExposureConfig(AppConfig):
    name = "exposure"
    verbose_name = "Exposure"
