from django.http import HttpRequest, HttpResponse


def start(request: HttpRequest) -> HttpResponse:
    return HttpResponse("")
