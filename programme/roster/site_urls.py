from django.urls import path

from programme.roster import site_views

app_name = "site"
urlpatterns = [
    path("", site_views.about, name="about"),
    path("settings/", site_views.settings, name="settings"),
    path("members/", site_views.members, name="members"),
    path("members/<int:pk>/role/", site_views.member_role, name="member_role"),
    path("members/<int:pk>/remove/", site_views.member_remove, name="member_remove"),
]
