"""Samples, agents and limits, and the forms of tasks; all under /s/<site code>/samples/."""

from django.urls import path

from exposure import agent_views, task_views, views

app_name = "exposure"
urlpatterns = [
    path("", views.samples, name="samples"),
    path("new/", views.sample_add, name="sample_add"),
    path("<int:pk>/", views.sample, name="sample"),
    path("<int:pk>/correct/", views.sample_replace, name="sample_replace"),
    path("<int:pk>/withdraw/", views.sample_withdraw, name="sample_withdraw"),
    path("agents/", agent_views.agents, name="agents"),
    path("agents/new/", agent_views.agent_add, name="agent_add"),
    path("agents/<int:pk>/", agent_views.agent, name="agent"),
    path("agents/<int:pk>/limit/", agent_views.limit_add, name="limit_add"),
    path("limits/<int:pk>/withdraw/", agent_views.limit_withdraw, name="limit_withdraw"),
    path("tasks/new/", task_views.task_add, name="task_add"),
    path("tasks/<int:pk>/", task_views.task_edit, name="task_edit"),
    path("tasks/<int:pk>/agent/", task_views.task_agent_add, name="task_agent_add"),
    path("task-agents/<int:pk>/", task_views.task_agent_edit, name="task_agent_edit"),
    path("task-agents/<int:pk>/remove/", task_views.task_agent_remove, name="task_agent_remove"),
]
