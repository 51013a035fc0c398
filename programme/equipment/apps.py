from django.apps import AppConfig


class EquipmentConfig(AppConfig):
    name = "programme.equipment"
    verbose_name = "Equipment"
