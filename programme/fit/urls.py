"""Addresses of the fit tests."""

from django.urls import path

from programme.fit import views

app_name = "fit"
urlpatterns = [
    path("", views.tests, name="tests"),
    path("new/", views.test_add, name="test_add"),
    path("day/", views.day, name="day"),
    path("preview/", views.preview, name="preview"),
    path("<int:pk>/", views.test, name="test"),
    path("<int:pk>/correct/", views.test_correct, name="test_correct"),
    path("<int:pk>/withdraw/", views.test_withdraw, name="test_withdraw"),
]
