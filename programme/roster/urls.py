"""Pages that change people; those that judge a person are in programme.selection."""

from django.urls import path

from programme.roster import views

app_name = "roster"
_PAPER = "<int:pk>/<slug:kind>/<int:row>"
urlpatterns = [
    path("new/", views.worker_add, name="worker_add"),
    path("<int:pk>/change/", views.worker_change, name="worker_change"),
    path(
        "<int:pk>/clearance/",
        views.paper_add,
        {"kind": "clearance"},
        name="clearance_add",
    ),
    path("<int:pk>/training/", views.paper_add, {"kind": "training"}, name="training_add"),
    path(
        "<int:pk>/seal-note/",
        views.paper_add,
        {"kind": "seal-note"},
        name="seal_note_add",
    ),
    path(f"{_PAPER}/correct/", views.paper_correct, name="paper_correct"),
    path(f"{_PAPER}/withdraw/", views.paper_withdraw, name="paper_withdraw"),
]
