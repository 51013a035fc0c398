"""Agents and their limits: the list, one agent, a site's own agents and limits."""

from dataclasses import dataclass
from typing import Any

from django.contrib import messages
from django.db.models import Count, Q, QuerySet
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.urls import reverse
from django.views.decorators.http import require_GET, require_http_methods

from exposure import actions
from exposure.agent_forms import KINDS, AgentForm, LimitForm
from exposure.models import Agent, ExposureLimit, Sure, TaskAgent
from programme.export import csv_response
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import Head, ReasonForm, page_asked, sort_asked, text_asked
from programme.rulepack.load import load
from programme.rulepack.pack import RulePack

SORTS = {"name": "name", "cas": "key", "kind": "kind", "limits": "limit_count"}
HEADER = (
    "CAS number",
    "agent",
    "kind",
    "list",
    "edition",
    "limit kind",
    "fraction",
    "limit",
    "unit",
    "averaged over min",
    "note",
    "source",
    "mark",
    "withdrawn on",
)


# From the surest to the least sure.
WEAKER = (Sure.VERIFIED, Sure.COMPUTED, Sure.SITE, Sure.MEMORY)


def _marks(column: str, agent: Agent) -> str:
    """How sure the columns joined by "+" are, the least sure of them, as it is shown."""
    if agent.site_id is not None:
        return str(Sure.SITE.label)
    known = [agent.sure_by_column[one] for one in column.split("+") if one in agent.sure_by_column]
    weakest = max(known or [agent.sure], key=WEAKER.index)
    return str(Sure(weakest).label)


@dataclass(frozen=True)
class Property:
    """One line of what is known of an agent."""

    name: str
    value: float | str | None
    unit: str
    mark: str


@dataclass(frozen=True)
class LimitRow:
    """One limit: whether the site is held to its list, and whether it has ended."""

    limit: ExposureLimit
    is_held: bool
    is_over: bool

    @property
    def kind(self) -> str:
        """The kind of limit without a time: some averages are over 10 h, not 8."""
        return KINDS[self.limit.kind]


def _properties(agent: Agent, need: str) -> list[Property]:
    rows: list[tuple[str, Any, str, str]] = [
        ("Immediately dangerous (IDLH) from", agent.idlh_value, agent.idlh_unit, "idlh"),
        ("Molar mass", agent.molar_mass_g_mol, "g/mol", "molar_mass"),
        ("Boiling point", agent.boiling_point_c, "°C", "boiling_point"),
        ("Vapour pressure at 20 °C", agent.vapour_pressure_kpa_20c, "kPa", "vapour_pressure"),
        ("Density as liquid", agent.liquid_density_kg_m3, "kg/m³", "liquid_density"),
        ("Filter need", need, "", "filters"),
        ("Warning by smell or irritation", agent.warning_properties, "", "warning"),
        ("Irritates the eyes", agent.get_eye_irritant_display(), "", "eye"),
        ("Taken up through the skin", agent.get_skin_notation_display(), "", "skin"),
        ("Carcinogen", agent.carcinogen_note, "", "carcinogen+iarc"),
    ]
    return [
        Property(name, value, unit, _marks(column, agent))
        for name, value, unit, column in rows
        if value not in {None, ""}
    ]


def agents_at(request: SiteRequest) -> QuerySet[Agent]:
    """The shipped agents and those of the request's site."""
    return Agent.objects.at(request.site)


def _filtered(request: SiteRequest, asked: dict[str, str]) -> QuerySet[Agent]:
    q = asked["q"]
    rows = agents_at(request)
    if q:
        rows = rows.filter(Q(name__icontains=q) | Q(synonyms__icontains=q) | Q(key__istartswith=q))
    if asked["kind"]:
        rows = rows.filter(kind=asked["kind"])
    if asked["whose"] == "site":
        rows = rows.filter(site=request.site)
    elif asked["whose"] == "used":
        used = TaskAgent.objects.at(request.site).values("agent")
        rows = rows.filter(pk__in=used)
    here = Q(limits__site=None) | Q(limits__site=request.site)
    standing = Q(limits__withdrawn_on=None) | Q(limits__withdrawn_on__gt=request.on)
    return rows.annotate(limit_count=Count("limits", filter=here & standing))


def _csv(request: SiteRequest, rows: QuerySet[Agent]) -> HttpResponse:
    limits = ExposureLimit.objects.at(request.site).filter(agent__in=rows.values("pk"))
    cells = (
        (
            one.agent.cas,
            one.agent.name,
            one.agent.kind,
            one.list_code,
            one.edition,
            one.kind,
            one.fraction,
            one.value,
            one.unit,
            one.averaging_min,
            one.note,
            one.source,
            one.get_sure_display(),
            one.withdrawn_on,
        )
        for one in limits.select_related("agent").order_by("agent__name", "list_code", "kind")
    )
    return csv_response(f"{request.site.code}-limits-{request.on}", HEADER, cells)


@site_page()
@require_GET
def agents(request: SiteRequest) -> HttpResponse:
    kind, whose = request.GET.get("kind", ""), request.GET.get("whose", "")
    asked = {
        "q": text_asked(request, "q"),
        "kind": kind if kind in Agent.Kind.values else "",
        "whose": whose if whose in {"site", "used"} else "",
    }
    sort = sort_asked(request, SORTS, "name")
    sign = "-" if sort.startswith("-") else ""
    rows = _filtered(request, asked).order_by(sign + SORTS[sort.lstrip("-")], "name")
    if request.GET.get("format") == "csv":
        return _csv(request, rows)
    heads = [
        Head("Agent", "name", sort),
        Head("CAS number", "cas", sort),
        Head("Kind", "kind", sort),
        Head("IDLH", is_number=True),
        Head("Filter need"),
        Head("Limits", "limits", sort, is_number=True),
    ]
    page = page_asked(request, rows)
    pack = load(request.site.rule_pack)
    context = {
        "page": page,
        "rows": [(one, need_of(one, pack)) for one in page.object_list],
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "kinds": Agent.Kind.choices,
        "has_any": agents_at(request).exists(),
    }
    return render(request, "exposure/agents.html", context)


def need_of(agent: Agent, pack: RulePack) -> str:
    """The agent's filter need in the codes of that rule pack; "" is not known."""
    return agent.en_filter_need if pack.need_scheme == "en" else agent.us_filter_need


def agent_of(request: SiteRequest, pk: int) -> Agent:
    """A shipped agent or one of the request's site, or not found."""
    return get_object_or_404(agents_at(request), pk=pk)


@site_page()
@require_GET
def agent(request: SiteRequest, pk: int) -> HttpResponse:
    one = agent_of(request, pk)
    pack = load(request.site.rule_pack)
    held = {*pack.limit_lists, *request.site.adopted_limit_lists, actions.SITE_LIST}
    rows = (
        ExposureLimit.objects.at(request.site)
        .filter(agent=one)
        .order_by("list_code", "kind", "fraction", "value")
    )
    limits = [
        LimitRow(
            limit,
            is_held=limit.list_code in held,
            is_over=limit.withdrawn_on is not None and limit.withdrawn_on <= request.on,
        )
        for limit in rows
    ]
    context = {
        "agent": one,
        "limits": limits,
        "properties": _properties(one, need_of(one, pack)),
        "used_in": TaskAgent.objects.at(request.site).filter(agent=one).select_related("task"),
        "pack": pack,
        "identity_mark": Sure(one.sure).label,
    }
    return render(request, "exposure/agent.html", context)


def _needs(pack: RulePack) -> tuple[str, ...]:
    return (pack.particulate_need, *pack.gas_needs, pack.supplied_air_need)


@site_page("limits")
@require_http_methods(["GET", "POST"])
def agent_add(request: SiteRequest) -> HttpResponse:
    pack = load(request.site.rule_pack)
    form = AgentForm(
        request.POST or None, site=request.site, needs=_needs(pack), scheme=pack.need_scheme
    )
    if form.is_valid():
        try:
            one = actions.add_agent(form.agent(), site=request.site, by=request.user)
        except ValueError as refused:
            form.add_error("cas", str(refused))
        else:
            messages.success(request, f"{one} is added. It has no limit yet.")
            return redirect("exposure:agent", request.site.code, one.pk)
    context = {"form": form, "agent": None}
    return render(
        request, "exposure/agent_form.html", context, status=422 if form.is_bound else 200
    )


@site_page("limits")
@require_http_methods(["GET", "POST"])
def limit_add(request: SiteRequest, pk: int) -> HttpResponse:
    one = agent_of(request, pk)
    first = {"fraction": "vapour"} if not one.is_particulate else {"fraction": "inhalable"}
    form = LimitForm(request.POST or None, agent=one, initial=first)
    if form.is_valid():
        try:
            limit = actions.add_limit(form.limit(), site=request.site, by=request.user)
        except ValueError as refused:
            form.add_error(None, str(refused))
        else:
            messages.success(request, f"Added: {limit}.")
            return redirect("exposure:agent", request.site.code, one.pk)
    context = {"form": form, "agent": one}
    return render(
        request, "exposure/agent_form.html", context, status=422 if form.is_bound else 200
    )


@site_page("limits")
@require_http_methods(["GET", "POST"])
def limit_withdraw(request: SiteRequest, pk: int) -> HttpResponse:
    limit = get_object_or_404(
        ExposureLimit.objects.filter(site=request.site).select_related("agent", "site"), pk=pk
    )
    form = ReasonForm(request.POST or None, submit="Withdraw this limit")
    if form.is_valid():
        reason, today = form.cleaned_data["reason"], request.site.today()
        try:
            actions.withdraw_limit(limit, on=today, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, f"Withdrawn: {limit}. It no longer counts from today.")
            return redirect("exposure:agent", request.site.code, limit.agent_id)
    back = reverse("exposure:agent", args=[request.site.code, limit.agent_id])
    context = {"form": form, "what": f"limit {limit}", "back": back}
    return render(request, "exposure/withdraw.html", context, status=422 if form.is_bound else 200)
