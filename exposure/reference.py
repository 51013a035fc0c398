"""Shipped agents, limits and particle sizes: read from their files, laid into the database."""

import csv
import io
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from django.conf import settings
from django.db import transaction
from django.utils import timezone

from exposure.models import Agent, ExposureLimit
from exposure.units import normalise
from programme.ledger import actions as ledger

LOADED_BY = "load_reference"
_AGENT_COLUMNS = {
    "name": "name",
    "kind": "kind",
    "synonyms": "synonyms",
    "idlh_unit": "idlh_unit",
    "warning_properties": "warning_properties",
    "eye_irritant": "eye_irritant",
    "skin_notation": "skin_notation",
    "carcinogen_note": "carcinogen_note",
    "us_filter_class": "us_filter_need",
    "en_filter_type": "en_filter_need",
    "sure": "sure",
    "source": "source",
    "remarks": "remarks",
}
_AGENT_NUMBERS = (
    "molar_mass_g_mol",
    "boiling_point_c",
    "vapour_pressure_kpa_20c",
    "liquid_density_kg_m3",
    "refractive_index",
    "idlh_value",
)
_LIMIT_VALUES = ("value", "source", "sure", "withdrawn_on")
# Median diameters by mass or aerodynamic impaction; a count median would understate the mass.
MASS_METRICS = frozenset({"MMAD", "MMD"})

LimitKey = tuple[int, str, str, str, str, int, str]


@dataclass(frozen=True)
class TypicalSize:
    """A particle size of a process as published, with its source and how sure it is."""

    id: str
    process: str
    metric: str
    mmad_um: float
    gsd: float | None
    note: str
    source: str
    sure: str

    @property
    def says(self) -> str:
        """One line for a list: process, diameter, spread and mark."""
        spread = f", GSD {self.gsd:g}" if self.gsd else ", GSD not given"
        mark = "unconfirmed" if self.sure == "memory" else self.sure
        return f"{self.process}: {self.mmad_um:g} µm{spread} ({self.metric}, {mark})"

    @property
    def cited(self) -> str:
        """The source as kept with a task's agent, its mark in front."""
        mark = "unconfirmed" if self.sure == "memory" else self.sure
        return f"{mark}: {self.source} [{self.id}]"[:200]


@dataclass
class Tally:
    """What a load did to one kind of record."""

    in_file: int = 0
    added: int = 0
    changed: list[str] = field(default_factory=list)
    withdrawn: int = 0

    @property
    def unchanged(self) -> int:
        """Rows of the file that stood already just so."""
        return self.in_file - self.added - len(self.changed)

    def __str__(self) -> str:
        return (
            f"{self.in_file} in the file: {self.added} added, {len(self.changed)} changed, "
            f"{self.unchanged} unchanged; {self.withdrawn} no longer in it"
        )


@dataclass(frozen=True)
class Loaded:
    """The outcome of one load."""

    agents: Tally
    limits: Tally

    @property
    def is_news(self) -> bool:
        """Whether anything was written."""
        return any(one.added or one.changed or one.withdrawn for one in (self.agents, self.limits))


def _rows(path: Path) -> Iterator[dict[str, str]]:
    text = path.read_text(encoding="utf-8")
    lines = [line for line in io.StringIO(text, newline="") if not line.startswith("#")]
    yield from csv.DictReader(lines)


def _number(text: str, *, name: str) -> float | None:
    try:
        return float(text) if text else None
    except ValueError as error:
        raise ValueError(f"{name}: {text!r} is not allowed; a number or nothing") from error


def typical_sizes(folder: Path | None = None) -> list[TypicalSize]:
    """The published particle sizes whose median is one of mass, in the order of the file."""
    path = (folder or settings.FIXTURES_DIR) / "size_distributions.csv"
    found = []
    for row in _rows(path):
        median = _number(row["mmad_um"], name=row["id"])
        if row["metric"] in MASS_METRICS and median is not None:
            spread = _number(row["gsd"], name=row["id"])
            rest = (row["note"], row["source"], row["sure"])
            found.append(
                TypicalSize(row["id"], row["process"], row["metric"], median, spread, *rest)
            )
    return found


def _agent_fields(row: dict[str, str]) -> dict[str, Any]:
    found: dict[str, Any] = {ours: row[theirs] for theirs, ours in _AGENT_COLUMNS.items()}
    for name in _AGENT_NUMBERS:
        found[name] = _number(row[name], name=f"{row['cas']} {name}")
    found["is_oil_aerosol"] = row["oil_aerosol"] == "yes"
    pairs = (pair.partition("=") for pair in row["sure_by_column"].split(";") if pair)
    found["sure_by_column"] = {name.strip(): mark.strip() for name, _, mark in pairs}
    return found


def _refresh(record: Any, fields: dict[str, Any]) -> dict[str, list[str]]:
    """Set what differs; returns field -> [before, after]."""
    changes = {}
    for name, value in fields.items():
        before = getattr(record, name)
        if before != value:
            changes[name] = [str(before), str(value)]
            setattr(record, name, value)
    return changes


def _load_agents(path: Path, acts: list[ledger.Act]) -> Tally:
    tally = Tally()
    known = {agent.key: agent for agent in Agent.objects.filter(site=None)}
    new, changed = [], []
    for row in _rows(path):
        tally.in_file += 1
        fields = _agent_fields(row)
        agent = known.pop(row["cas"], None)
        if agent is None:
            new.append(Agent(key=row["cas"], **fields))
        elif changes := _refresh(agent, fields):
            changed.append(agent)
            tally.changed.append(agent.name)
            acts.append(ledger.Act("shipped agent changed", agent, detail=changes))
    Agent.objects.bulk_create(new, batch_size=500)
    names = [*_AGENT_COLUMNS.values(), *_AGENT_NUMBERS, "is_oil_aerosol", "sure_by_column"]
    Agent.objects.bulk_update(changed, names, batch_size=200)
    tally.added, tally.withdrawn = len(new), len(known)
    return tally


def _limit_key(limit: ExposureLimit) -> LimitKey:
    return (
        limit.agent_id,
        limit.list_code,
        limit.kind,
        limit.fraction,
        limit.unit,
        limit.averaging_min,
        limit.note,
    )


def _shipped_limit(row: dict[str, str], agents: dict[str, int]) -> ExposureLimit:
    if row["cas"] not in agents:
        raise ValueError(f"cas: {row['cas']} is not in the file of agents; add the agent first")
    value, unit = normalise(float(row["value"]), row["unit"])
    return ExposureLimit(
        agent_id=agents[row["cas"]],
        list_code=row["jurisdiction"],
        kind=row["kind"],
        fraction=row["fraction"],
        value=value,
        unit=unit,
        averaging_min=int(row["averaging_min"]),
        note=row["note"],
        source=row["source"],
        sure=row["sure"],
    )


def _load_limits(path: Path, acts: list[ledger.Act]) -> Tally:
    tally = Tally()
    agents = dict(Agent.objects.filter(site=None).values_list("key", "pk"))
    shipped = ExposureLimit.objects.filter(site=None).select_related("agent")
    known = {_limit_key(limit): limit for limit in shipped}
    new, changed = [], []
    for row in _rows(path):
        tally.in_file += 1
        limit = _shipped_limit(row, agents)
        old = known.pop(_limit_key(limit), None)
        if old is None:
            new.append(limit)
        elif changes := _refresh(old, {name: getattr(limit, name) for name in _LIMIT_VALUES}):
            changed.append(old)
            tally.changed.append(str(old))
            acts.append(ledger.Act("shipped limit changed", old, detail=changes))
    gone = [limit for limit in known.values() if limit.withdrawn_on is None]
    for limit in gone:
        limit.withdrawn_on = timezone.now().date()
        acts.append(ledger.Act("shipped limit withdrawn", limit))
    ExposureLimit.objects.bulk_create(new, batch_size=500)
    ExposureLimit.objects.bulk_update([*changed, *gone], list(_LIMIT_VALUES), batch_size=200)
    tally.added, tally.withdrawn = len(new), len(gone)
    return tally


@transaction.atomic
def load_reference(folder: Path | None = None) -> Loaded:
    """Lay agents.csv and limits.csv of `folder` (default: fixtures) into the database.

    Shipped rows follow the files; rows of a site are never touched and nothing is deleted: a
    limit that left the file is withdrawn from today, an agent that left it stays. What changed
    stands in the ledger "programme" with its former value.

    Raises:
        ValueError: a number or unit cannot be read, or a limit names an agent that is not there.
        FileNotFoundError: a file is missing.
    """
    folder = folder or settings.FIXTURES_DIR
    acts: list[ledger.Act] = []
    done = Loaded(
        _load_agents(folder / "agents.csv", acts), _load_limits(folder / "limits.csv", acts)
    )
    if done.is_news:
        first = Agent.objects.filter(site=None).order_by("pk")[0]
        says = f"agents {done.agents}. limits {done.limits}."
        acts.append(ledger.Act("reference data loaded", first, says=says))
        ledger.enter_many(acts, chain="programme", by=LOADED_BY)
    return done
