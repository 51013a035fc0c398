"""Addresses of people as the chain judges them; included under `people/`."""

from django.urls import path

from programme.selection import person_views

urlpatterns = [
    path("", person_views.people, name="people"),
    path("<int:pk>/", person_views.person, name="person"),
    path("<int:pk>/card/", person_views.card, name="card"),
]
