from django.urls import path

from programme.records import api

app_name = "api"
urlpatterns = [
    path("", api.index, name="index"),
    path("sites/", api.sites, name="sites"),
    path("sites/<slug:code>/chains/", api.chains, name="chains"),
    path("sites/<slug:code>/tasks/<slug:task>/chain/", api.chain, name="chain"),
    path("sites/<slug:code>/mismatches/", api.mismatches, name="mismatches"),
]
