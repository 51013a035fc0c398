"""The shift sheet of a task: only those who may start; posted paper never shames."""

from datetime import datetime

from programme.drawing.paper import chain_drawing
from programme.ledger.actions import head_of
from programme.records.papers.sheet import BOLD, FONT, Sheet
from programme.selection.chain import Chain


def shift_sheet(chain: Chain, *, by: str, printed_at: datetime) -> bytes:
    """One task on one day as PDF: the verdict, who may start, in what, and until when."""
    sheet = Sheet(
        title=f"{chain.site}: {chain.task}, {chain.on}",
        footer=f"{chain.rule_pack_title}, edition {chain.edition}; ledger {head_of(chain.site_code)}",
        printed_at=printed_at,
        by=by,
    )
    sheet.heading(chain.task, level=1)
    sheet.text(f"Shift that starts on {chain.on}", style="h3")
    sheet.text(chain.verdict)
    sheet.space()
    sheet.draw(chain_drawing(chain, width_pt=sheet.width_pt, font=FONT, bold=BOLD))
    sheet.heading("May start")
    rows = [
        (one.worker, one.wears, one.filter_says, one.good_until or "-", "")
        for one in chain.crew
        if one.may_start
    ]
    header = ("Worker", "Wears", "Filter", "Lapses on", "Seal checked, shaven (initials)")
    sheet.table(header, rows, widths=(2.2, 3, 2.2, 1.4, 2))
    sheet.text(
        "Whoever is not on this sheet does not start this task today: see the coordinator. Leave at "
        "once on smell or taste, harder breathing or a leak, and change before going back.",
    )
    return sheet.pdf()
