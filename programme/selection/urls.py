from django.urls import include, path

from programme.selection import crew_views, views

app_name = "selection"
urlpatterns = [
    path("today/", views.today, name="today"),
    path("tasks/", views.tasks, name="tasks"),
    path("tasks/<int:pk>/", views.task, name="task"),
    path("tasks/<int:pk>/crew/", crew_views.crew, name="crew"),
    path("crew/<int:pk>/off/", crew_views.take_off, name="take_off"),
    path("crew/<int:pk>/back/", crew_views.put_back, name="put_back"),
    path("tasks/<int:pk>/assembly/", crew_views.assign, name="assign"),
    path("assignments/<int:pk>/end/", crew_views.assign_end, name="assign_end"),
    path("people/", include("programme.selection.person_urls")),
]
