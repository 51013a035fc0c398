"""Respirators; all under /s/<site code>/respirators/."""

from django.urls import path

from programme.equipment import change_views, part_views, views

app_name = "equipment"
_FACEPIECE, _ELEMENT, _ASSEMBLY = ({"kind": kind} for kind in ("facepiece", "element", "assembly"))
urlpatterns = [
    path("", views.respirators, name="respirators"),
    path("new/", part_views.part_add, _ASSEMBLY, name="assembly_add"),
    path("<int:pk>/", views.assembly, name="assembly"),
    path("<int:pk>/change/", part_views.part_change, _ASSEMBLY, name="assembly_change"),
    path("<int:pk>/withdraw/", part_views.part_withdraw, _ASSEMBLY, name="assembly_withdraw"),
    path("facepieces/new/", part_views.part_add, _FACEPIECE, name="facepiece_add"),
    path("facepieces/<int:pk>/", part_views.part_change, _FACEPIECE, name="facepiece_change"),
    path(
        "facepieces/<int:pk>/withdraw/",
        part_views.part_withdraw,
        _FACEPIECE,
        name="facepiece_withdraw",
    ),
    path("filters/new/", part_views.part_add, _ELEMENT, name="element_add"),
    path("filters/<int:pk>/", part_views.part_change, _ELEMENT, name="element_change"),
    path("filters/<int:pk>/withdraw/", part_views.part_withdraw, _ELEMENT, name="element_withdraw"),
    path("changes/", change_views.changes, name="changes"),
    path("changes/new/", change_views.filter_change, name="filter_change"),
    path("changes/<int:pk>/withdraw/", change_views.change_withdraw, name="change_withdraw"),
    path("classes/", views.classes, name="classes"),
]
