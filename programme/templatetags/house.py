"""Tags of the page frame."""

from typing import Any

from django import template
from django.template.base import NodeList, Parser, Token
from django.template.context import Context

register = template.Library()


class _Keep(template.Node):
    def __init__(self, name: str, nodelist: NodeList) -> None:
        self.name, self.nodelist = name, nodelist

    def render(self, context: Context) -> str:
        context[self.name] = self.nodelist.render(context)
        return ""


@register.tag
def keep(parser: Parser, token: Token) -> Any:
    """`{% keep heading %}...{% endkeep %}`: render once, print where `{{ heading }}` stands.

    A block can stand only once in a template, but its words are wanted in the title and the h1.
    """
    _, name = token.split_contents()
    nodelist = parser.parse(("endkeep",))
    parser.delete_first_token()
    return _Keep(name, nodelist)
