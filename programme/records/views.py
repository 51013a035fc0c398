from django.http import HttpResponse

from programme.roster.access import SiteRequest, site_page


@site_page()
def records(request: SiteRequest) -> HttpResponse:
    return HttpResponse(f"<h1>{request.site.pk}</h1>")


@site_page()
def shift_sheet(request: SiteRequest, pk: int) -> HttpResponse:
    return HttpResponse(f"<h1>{pk}</h1>")
