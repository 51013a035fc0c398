"""The results of a task as points against the limit: what the picture and its table show."""

from dataclasses import dataclass
from datetime import date

from exposure.models import Task
from programme.selection.estimates import Estimate, estimates
from programme.selection.facts import gather


@dataclass(frozen=True)
class Picture:
    """One group's results and the figures drawn over them, in one unit; NaN where there is none."""

    title: str
    unit: str
    detected: tuple[float, ...]
    below: tuple[float, ...]
    limit: float
    gm: float
    x95: float
    upper70: float
    upper95: float


def _picture(name: str, estimate: Estimate, values: list[tuple[float, bool]]) -> Picture:
    return Picture(
        title=name,
        unit=estimate.unit,
        detected=tuple(value for value, is_censored in values if not is_censored),
        below=tuple(value for value, is_censored in values if is_censored),
        limit=estimate.binding.value,
        gm=estimate.gm,
        x95=estimate.x95,
        upper70=estimate.x95_upper70,
        upper95=estimate.x95_upper95,
    )


def pictures_of(task: Task, *, on: date) -> list[Picture]:
    """One picture for each group of the task that has results."""
    facts = gather(task.site, on=on, tasks=[task])
    return [
        _picture(one.fact.agent.name, estimate, one.values[kind])
        for one in estimates(facts).values()
        for kind, estimate in one.estimates.items()
        if estimate.n
    ]
