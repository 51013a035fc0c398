"""Addresses of bringing files in; included under the records of a site."""

from django.urls import path

from programme.records import views_import as views

urlpatterns = [
    path("", views.imports, name="imports"),
    path("<slug:kind>/new/", views.import_start, name="import_start"),
    # The short name is what other pages link by.
    path("<slug:kind>/new/", views.import_start, name="import"),
    path("<int:pk>/", views.import_preview, name="import_preview"),
    path("<int:pk>/reading/", views.import_reading, name="import_reading"),
    path("<int:pk>/match/", views.import_match, name="import_match"),
    path("<int:pk>/store/", views.import_store, name="import_store"),
    path("<int:pk>/errors/", views.import_errors, name="import_errors"),
    path("<int:pk>/undo/", views.import_undo, name="import_undo"),
]
