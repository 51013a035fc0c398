"""Respirators: facepieces, filters and cartridges, assemblies, and the classes of the rule pack."""

from dataclasses import dataclass
from typing import Any

from django.db.models import Count, Q, QuerySet
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, render
from django.views.decorators.http import require_GET

from programme.equipment.fitting import assigned_factor, parts_of
from programme.equipment.models import Assembly, Element, Facepiece, FacepieceKind
from programme.export import csv_response
from programme.ledger.models import Entry
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import Head, in_order, page_asked, sort_asked, text_asked
from programme.roster.models import active_on
from programme.rulepack.load import load
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import RespiratorClass

STATES = {"use": "in use", "withdrawn": "withdrawn", "all": "all of them"}


@dataclass(frozen=True)
class AssemblyRow:
    """One line of the list of assemblies."""

    assembly: Assembly
    row: RespiratorClass | None
    apf: int | None
    worn_by: int

    @property
    def class_name(self) -> str:
        """The class as the pack names it, or what was recorded if the pack does not know it."""
        return self.row.name if self.row else f"{self.assembly.respirator_class}: not in this pack"


SORTS: dict[str, Any] = {
    "name": lambda one: one.assembly.name.casefold(),
    "facepiece": lambda one: one.assembly.facepiece.name.casefold(),
    "class": lambda one: one.class_name,
    "apf": lambda one: one.apf,
    "stock": lambda one: one.assembly.in_stock,
    "worn": lambda one: one.worn_by,
}
CSVS: dict[str, tuple[str, ...]] = {
    "assemblies": (
        "assembly",
        "class",
        "APF",
        "source",
        "mark",
        "facepiece",
        "facepiece kind",
        "filter or cartridge",
        "approval number",
        "in stock",
        "worn by",
        "withdrawn on",
    ),
    "facepieces": ("facepiece", "kind", "sizes", "withdrawn on"),
    "elements": (
        "filter or cartridge",
        "particulate class",
        "gas types",
        "capacity class",
        "used in pairs",
        "area cm2",
        "resistance when new Pa",
        "maker's limit h",
        "cartridge life h",
        "life from",
        "in stock",
        "withdrawn on",
    ),
}


def _withdrawn(request: SiteRequest, state: str) -> Q:
    gone = Q(withdrawn_on__lte=request.on)
    return {"use": ~gone | Q(withdrawn_on=None), "withdrawn": gone}.get(state, Q())


def _asked(request: SiteRequest) -> dict[str, str]:
    state, kind = request.GET.get("state", ""), request.GET.get("kind", "")
    return {
        "q": text_asked(request, "q"),
        "state": state if state in STATES else "use",
        "kind": kind if kind in FacepieceKind.values else "",
    }


def assemblies_at(request: SiteRequest) -> QuerySet[Assembly]:
    """The assemblies of the request's site with their parts."""
    rows = Assembly.objects.for_user(request.user).at(request.site)
    found: QuerySet[Assembly] = rows.select_related("facepiece", "element", "site")
    return found


def _assembly_rows(
    request: SiteRequest, asked: dict[str, str], pack: RulePack
) -> list[AssemblyRow]:
    worn = Q(crew__active_from__lte=request.on) & (
        Q(crew__active_to=None) | Q(crew__active_to__gt=request.on)
    )
    rows = assemblies_at(request).filter(_withdrawn(request, asked["state"]))
    if asked["q"]:
        q = asked["q"]
        rows = rows.filter(
            Q(name__icontains=q)
            | Q(facepiece__name__icontains=q)
            | Q(element__name__icontains=q)
            | Q(approval_number__icontains=q)
        )
    if asked["kind"]:
        rows = rows.filter(facepiece__kind=asked["kind"])
    rows = rows.annotate(worn_by=Count("crew__worker", filter=worn, distinct=True))
    return [
        AssemblyRow(
            one, pack.find_class(one.respirator_class), assigned_factor(one, pack), one.worn_by
        )
        for one in rows
    ]


def _parts(request: SiteRequest, model: Any, asked: dict[str, str]) -> Any:
    rows = model.objects.for_user(request.user).at(request.site)
    rows = rows.filter(_withdrawn(request, asked["state"]))
    if asked["q"]:
        rows = rows.filter(name__icontains=asked["q"])
    if model is Facepiece:
        rows = rows.prefetch_related("sizes")
        return rows.filter(kind=asked["kind"]) if asked["kind"] else rows
    return rows


def _csv(request: SiteRequest, name: str, rows: Any) -> HttpResponse:
    cells: dict[str, Any] = {
        "assemblies": lambda one: (
            one.assembly.name,
            one.class_name,
            one.apf,
            one.row.source if one.row else None,
            one.row.sure if one.row else None,
            one.assembly.facepiece.name,
            one.assembly.facepiece.kind,
            one.assembly.element.name if one.assembly.element else None,
            one.assembly.approval_number,
            one.assembly.in_stock,
            one.worn_by,
            one.assembly.withdrawn_on,
        ),
        "facepieces": lambda one: (
            one.name,
            one.kind,
            ", ".join(size.label for size in one.sizes.all()),
            one.withdrawn_on,
        ),
        "elements": lambda one: (
            one.name,
            one.particulate_class,
            ", ".join(one.gas_elements),
            one.gas_class,
            one.is_pair,
            one.area_cm2,
            one.clean_resistance_pa,
            one.maker_max_h,
            one.cartridge_life_h,
            one.cartridge_life_source,
            one.in_stock,
            one.withdrawn_on,
        ),
    }
    file_name = f"{request.site.code}-{name}-{request.on}"
    return csv_response(file_name, CSVS[name], (cells[name](one) for one in rows))


@site_page()
@require_GET
def respirators(request: SiteRequest) -> HttpResponse:
    asked, pack = _asked(request), load(request.site.rule_pack)
    sort = sort_asked(request, SORTS, "name")
    rows = in_order(_assembly_rows(request, asked, pack), sort, SORTS)
    parts = {
        "facepieces": _parts(request, Facepiece, asked),
        "elements": _parts(request, Element, asked),
    }
    if request.GET.get("format") == "csv":
        name = request.GET.get("list", "")
        name = name if name in CSVS else "assemblies"
        return _csv(request, name, {"assemblies": rows, **parts}[name])
    heads = [
        Head("Assembly", "name", sort),
        Head("Facepiece", "facepiece", sort),
        Head("Filter or cartridge"),
        Head("Class", "class", sort),
        Head("Assigned protection factor", "apf", sort, is_number=True),
        Head("In stock", "stock", sort, is_number=True),
        Head("Worn by", "worn", sort, is_number=True),
    ]
    context = {
        "page": page_asked(request, rows),
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "states": STATES,
        "kinds": FacepieceKind.choices,
        "pack": pack,
        "has_any": Facepiece.objects.at(request.site).exists(),
        **parts,
    }
    return render(request, "equipment/respirators.html", context)


@dataclass(frozen=True)
class Datum:
    """One figure of an element's data sheet, or what is assumed in its place."""

    name: str
    value: float | None
    unit: str
    if_missing: str


def data_of(element: Element) -> list[Datum]:
    """The figures of an element; where one is missing, what follows from that."""
    found = []
    if element.particulate_class:
        assumed = "not recorded: a typical figure is assumed, and the working says so"
        found += [
            Datum("Filter area, all elements together", element.area_cm2, "cm2", assumed),
            Datum("Resistance when new at 85 L/min", element.clean_resistance_pa, "Pa", assumed),
        ]
    found.append(Datum("Maker's time limit in use", element.maker_max_h, "h", "none recorded"))
    if element.is_gas:
        missing = "not recorded: no change time can be given from it"
        found.append(
            Datum("Cartridge life from objective data", element.cartridge_life_h, "h", missing)
        )
    return found


@site_page()
@require_GET
def assembly(request: SiteRequest, pk: int) -> HttpResponse:
    one = get_object_or_404(assemblies_at(request), pk=pk)
    pack = load(request.site.rule_pack)
    crew = one.crew.filter(active_on(request.on)).select_related("worker__site", "task", "size")
    history = Entry.objects.filter(
        chain=request.site.code, subject_kind="equipment.assembly", subject_id=str(one.pk)
    )
    changes = one.changes.in_force().select_related("worker").order_by("-fitted_at")[:10]
    context = {
        "assembly": one,
        "row": pack.find_class(one.respirator_class),
        "apf": assigned_factor(one, pack),
        "element": one.element,
        "parts": parts_of(one.element) if one.element else "",
        "data": data_of(one.element) if one.element else [],
        "crew": crew.order_by("worker__name", "task__name"),
        "changes": changes,
        "pack": pack,
        "is_over": one.withdrawn_on is not None and one.withdrawn_on <= request.on,
        "history": history.order_by("-serial"),
    }
    return render(request, "equipment/assembly.html", context)


CLASS_SORTS: dict[str, Any] = {
    "class": lambda row: row.name,
    "kind": lambda row: row.inlet,
    "apf": lambda row: row.apf,
}
CLASS_HEADER = (
    "class",
    "name",
    "family",
    "mode",
    "facepiece",
    "APF",
    "APF with maker's evidence",
    "APF against particles alone",
    "holds with",
    "source",
    "mark",
    "note",
)


@site_page()
@require_GET
def classes(request: SiteRequest) -> HttpResponse:
    pack = load(request.site.rule_pack)
    families = {row.family: row.family.replace("_", " ") for row in pack.classes}
    inlets = {row.inlet: row.inlet.replace("_", " ") for row in pack.classes}
    family, inlet = request.GET.get("family", ""), request.GET.get("kind", "")
    sort = sort_asked(request, CLASS_SORTS, "apf")
    rows = [
        row
        for row in in_order(pack.classes, sort, CLASS_SORTS)
        if family in {row.family, ""} and inlet in {row.inlet, ""}
    ]
    if request.GET.get("format") == "csv":
        cells = (
            (
                row.id,
                row.name,
                row.family,
                row.mode,
                row.inlet,
                row.apf,
                row.apf_with_maker_evidence,
                row.apf_particulate_only,
                ", ".join(row.elements),
                row.source,
                row.sure,
                row.note,
            )
            for row in rows
        )
        return csv_response(f"{pack.name}-respirator-classes", CLASS_HEADER, cells)
    heads = [
        Head("Class", "class", sort),
        Head("Facepiece", "kind", sort),
        Head("Assigned protection factor", "apf", sort, is_number=True),
        Head("Holds with"),
        Head("Source"),
        Head("Mark"),
    ]
    context = {
        "pack": pack,
        "rows": rows,
        "heads": heads,
        "sort": sort,
        "families": families,
        "inlets": inlets,
        "asked": {"family": family, "kind": inlet},
    }
    return render(request, "equipment/classes.html", context)
