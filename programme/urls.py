"""All addresses. Pages of a site live under /s/<site code>/."""

from django.urls import include, path

from programme.roster import views as roster_views

urlpatterns = [
    path("", roster_views.start, name="start"),
    path("accounts/", include("allauth.urls")),
    path("s/<slug:code>/", include("programme.selection.urls")),
    path("s/<slug:code>/site/", include("programme.roster.site_urls")),
    path("s/<slug:code>/people/", include("programme.roster.urls")),
    path("s/<slug:code>/samples/", include("exposure.urls")),
    path("s/<slug:code>/fit-tests/", include("programme.fit.urls")),
    path("s/<slug:code>/respirators/", include("programme.equipment.urls")),
    path("s/<slug:code>/records/", include("programme.records.urls")),
    path("api/", include("programme.records.api_urls")),
]
