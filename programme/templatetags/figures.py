"""Figures in templates: `{{ value|up }}`, `{{ value|down }}`, `{{ value|near }}`, `{{ unit|unit }}`."""

from django import template

from programme import figures

register = template.Library()

register.filter("up", figures.up)
register.filter("down", figures.down)
register.filter("near", figures.near)
register.filter("unit", figures.unit_sign)
