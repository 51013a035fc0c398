"""Response headers that every personal page carries."""

from collections.abc import Callable

from django.http import HttpRequest, HttpResponse


class PersonalPagesAreNotStored:
    """Pages of a signed-in user are never kept by a browser or a proxy."""

    def __init__(self, get_response: Callable[[HttpRequest], HttpResponse]) -> None:
        self.get_response = get_response

    def __call__(self, request: HttpRequest) -> HttpResponse:
        response = self.get_response(request)
        if not response.has_header("Cache-Control"):
            response["Cache-Control"] = "no-store"
        return response
