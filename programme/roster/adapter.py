"""Sign-in: nobody signs up by themselves; an administrator adds people."""

from allauth.account.adapter import DefaultAccountAdapter
from django.http import HttpRequest


class ClosedDoor(DefaultAccountAdapter):
    def is_open_for_signup(self, request: HttpRequest) -> bool:  # noqa: ARG002  allauth's signature
        return False
