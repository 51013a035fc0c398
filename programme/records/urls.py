from django.urls import include, path

app_name = "records"
urlpatterns = [
    path("import/", include("programme.records.import_urls")),
]
