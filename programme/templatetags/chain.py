"""Drawing chains and points in templates, and turning remedies into addresses."""

from typing import Any

from django import template
from django.template.context import Context
from django.urls import NoReverseMatch, reverse

from programme.drawing import chain as drawing
from programme.drawing.points import points

register = template.Library()


@register.inclusion_tag("_chain_mini.html")
def chain_mini(chain: Any) -> dict[str, Any]:
    """The chain as six small bars for a list."""
    states = [link.state for link in chain.links]
    broken = chain.first_break
    return {
        "bars": drawing.mini_bars(states),
        "says": f"breaks at {broken.name}" if broken else chain.state,
    }


@register.inclusion_tag("_chain_svg.html")
def chain_svg(chain: Any) -> dict[str, Any]:
    """The chain as one wide drawing; decoration, the words stand in the list below it."""
    states = [link.state for link in chain.links]
    width, height = drawing.chain_size(states)
    return {"links": drawing.chain_links(states), "width": width, "height": height}


@register.inclusion_tag("_points.html")
def points_svg(picture: Any) -> dict[str, Any]:
    """Results of one group on a log axis against the limit."""
    return {"drawn": points(picture), "picture": picture}


# What a page asks of the reader's role; a page that is not named here only shows.
ACT_OF_PAGE = {
    "equipment:filter_change": "assign",
    "exposure:limit_add": "limits",
    "exposure:sample_add": "samples",
    "exposure:task_agent_add": "tasks",
    "exposure:task_edit": "tasks",
    "fit:test_add": "fit_tests",
    "records:import_start": "samples",
    "roster:clearance_add": "clearance",
    "roster:seal_note_add": "roster",
    "roster:training_add": "roster",
    "selection:assign": "assign",
    "selection:crew": "assign",
}


@register.simple_tag(takes_context=True)
def remedy_url(context: Context, remedy: Any, site: Any) -> str:
    """The address of a remedy's page, or "" where it has none that this reader may open."""
    act = ACT_OF_PAGE.get(remedy.page, "")
    if not remedy.page or (act and not context["can"][act]):
        return ""
    try:
        return reverse(remedy.page, args=[site.code, *remedy.args]) + remedy.query
    except NoReverseMatch:
        return ""
