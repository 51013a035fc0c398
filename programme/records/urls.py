from django.urls import include, path

from programme.records import views

app_name = "records"
urlpatterns = [
    path("", views.records, name="records"),
    path("tasks/<int:pk>/shift-sheet/", views.shift_sheet, name="shift_sheet"),
    path("ledger/", views.ledger, name="ledger"),
    path("ledger/check/", views.ledger_check, name="ledger_check"),
    path("import/", include("programme.records.import_urls")),
]
