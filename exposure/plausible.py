"""What is wrong or merely unlikely about a sample: the same questions for form and import."""

import math
import statistics
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date

from exposure.models import Sample, TaskAgent, Unit
from programme.figures import near, unit_sign, up
from programme.roster.asking import same_day_past

# Flow times minutes may differ from the volume by this part; common practice.
VOLUME_TOLERANCE = 0.05
# Between a usual spread in one group (GSD under 7) and a unit that slipped by 1000.
SLIP = 300.0
# What a result a thousand times too high was most likely reported in.
SMALLER_UNITS = {"mg/m3": "ug/m3", "ppm": "ppb"}
LONGEST_SHORT_TERM_MIN = 30.0
# Part of the shift from which a sample is commonly taken as full shift; common practice.
FULL_SHIFT_PART = 0.7


@dataclass(frozen=True)
class Finding:
    """One thing about a sample: refused, or asked and kept if it is meant.

    Attributes:
        field: the box it stands at.
        says: names the value and what is allowed.
        is_question: unlikely, not impossible.
        offer: (box, value) that is most likely meant, or None.
    """

    field: str
    says: str
    is_question: bool = False
    offer: tuple[str, str] | None = None


def _unit(sample: Sample) -> Iterable[Finding]:
    row = sample.task_agent
    gas_only = sample.unit == Unit.PPM
    if gas_only and (row.agent.is_particulate or row.form == TaskAgent.Form.PARTICULATE):
        yield Finding(
            "unit",
            f"Unit: {sample.unit_as_reported} is not allowed for {row.agent} as particles; "
            "it must be mg/m3 or ug/m3 (f/cm3 for fibres). ppm is for gases and vapours only.",
            offer=("unit", "f/cm3" if row.agent.kind == "fibre" else "mg/m3"),
        )
    elif sample.unit == Unit.F_CM3 and row.agent.kind != "fibre":
        yield Finding(
            "unit",
            f"Unit: {sample.unit_as_reported} is not allowed for {row.agent}, which is not a "
            "fibre; it must be mg/m3, ug/m3 or, for a gas or vapour, ppm.",
        )
    elif sample.unit == Unit.MG_M3 and row.agent.kind == "fibre":
        yield Finding(
            "unit",
            f"Unit: {row.agent} is counted in f/cm3; is {sample.unit_as_reported} meant?",
            is_question=True,
        )


def _dates(sample: Sample, *, today: date) -> Iterable[Finding]:
    day, task, worker = sample.sampled_on, sample.task_agent.task, sample.worker
    start = f"Sampled on: {day} is not allowed; "
    if day > today:
        says = f"{start}it lies in the future, today is {today}."
        yield Finding("sampled_on", says, offer=("sampled_on", str(same_day_past(day, today))))
    if day < task.active_from or (task.active_to and day >= task.active_to):
        until = f" to {task.active_to}" if task.active_to else ""
        yield Finding("sampled_on", f"{start}{task} is a task from {task.active_from}{until}.")
    if worker is None:
        return
    if worker.born_on and day <= worker.born_on:
        yield Finding("sampled_on", f"{start}{worker.name} was not born yet.")
    elif day < worker.active_from or (worker.active_to and day >= worker.active_to):
        until = f" to {worker.active_to}" if worker.active_to else ""
        yield Finding(
            "sampled_on", f"{start}{worker.name} is on the roster from {worker.active_from}{until}."
        )


def _volume(sample: Sample) -> Iterable[Finding]:
    flow, minutes, volume = sample.flow_l_min, sample.minutes, sample.volume_l
    if not (flow and minutes and volume):
        return
    drawn = flow * minutes
    if not abs(drawn - volume) <= VOLUME_TOLERANCE * volume:
        yield Finding(
            "volume_l",
            f"Volume: {near(flow)} L/min for {near(minutes)} min makes {near(drawn)} L, not "
            f"{near(volume)} L (more than 5 % apart). Mend one of the three, or tick below.",
            is_question=True,
        )


def _span(sample: Sample) -> Iterable[Finding]:
    minutes, shift_h = sample.minutes, sample.task_agent.task.shift_h
    if minutes is None:
        return
    if sample.span == Sample.Span.SHORT and minutes > LONGEST_SHORT_TERM_MIN:
        yield Finding(
            "minutes",
            f"Minutes: {near(minutes)} is long for a short-term sample (usually 15). Meant so?",
            is_question=True,
        )
    part = minutes / (60.0 * shift_h)
    if sample.span == Sample.Span.FULL and part < FULL_SHIFT_PART:
        yield Finding(
            "minutes",
            f"Minutes: {near(minutes)} cover {math.floor(100 * part)} % of the {near(shift_h)} h "
            "shift. Choose part of the shift, or tick below.",
            is_question=True,
        )


def _slip(sample: Sample, former: Iterable[float]) -> Iterable[Finding]:
    """`former`: uncensored results of the group that stand, in the unit of the sample."""
    logs = [math.log(value) for value in former if value > 0]
    if not logs or not sample.value > 0:
        return
    middle = math.exp(statistics.median(logs))
    times = sample.value / middle
    is_low = times <= 1 / SLIP and not sample.is_censored
    if not (times >= SLIP or is_low):
        return
    sign = unit_sign(sample.unit)
    other = sample.value / 1000 if times > 1 else sample.value * 1000
    smaller = SMALLER_UNITS.get(sample.unit_as_reported, "")
    how = f"{up(times)} times" if times > 1 else f"1/{up(1 / times)} of"
    yield Finding(
        "result",
        f"Result: {sample.result_as_reported} {unit_sign(sample.unit_as_reported)} is {how} the "
        f"middle of the group's former results, {near(middle)} {sign} ({len(logs)} of them). Did "
        f"a unit slip by 1000? That would make {near(other)} {sign}. Mend it, or tick below.",
        is_question=True,
        offer=("unit", smaller) if times > 1 and smaller else None,
    )


def findings(sample: Sample, *, today: date, former: Iterable[float] = ()) -> list[Finding]:
    """Everything that stands against an unsaved sample, refusals first.

    Args:
        sample: with `task_agent` (its task and agent) and `worker` loaded, value and unit read.
        today: the date at the site.
        former: the group's uncensored results in the same unit; see `former_results`.
    """
    found = [
        *_unit(sample),
        *_dates(sample, today=today),
        *_volume(sample),
        *_span(sample),
        *_slip(sample, former),
    ]
    return sorted(found, key=lambda one: one.is_question)


def former_results(row: TaskAgent, *, unit: str, without: int | None = None) -> list[float]:
    """Uncensored results of the group that stand, in that unit; `without` leaves one record out."""
    rows = Sample.objects.in_force().filter(task_agent=row, unit=unit, is_censored=False)
    rows = rows.exclude(where=Sample.Where.INSIDE).exclude(pk=without)
    return list(rows.order_by("-sampled_on").values_list("value", flat=True)[:200])
