"""Finds the task, agent or worker that a row names, in lists read once."""

import re
from collections import defaultdict
from collections.abc import Iterable

from exposure.models import Agent
from programme.roster.models import Worker

_SHOWN = 6


def folded(text: str) -> str:
    """A name as it is compared: lower case, single spaces."""
    return " ".join(text.casefold().split())


def some(names: Iterable[str]) -> str:
    """The first names of a list, and how many more there are."""
    listed = sorted(set(names))
    rest = len(listed) - _SHOWN
    return ", ".join(listed[:_SHOWN]) + (f" and {rest} more" if rest > 0 else "")


def agent_names(agent: Agent) -> set[str]:
    """Every name an agent answers to, folded: name, number, synonyms."""
    synonyms = re.split(r"[;\n]", agent.synonyms)
    return {folded(name) for name in (agent.name, agent.key, *synonyms) if name.strip()}


class AgentBook:
    """Agents by every name they answer to."""

    def __init__(self, agents: Iterable[Agent]) -> None:
        self.by_name: dict[str, set[Agent]] = defaultdict(set)
        for agent in agents:
            for name in agent_names(agent):
                self.by_name[name].add(agent)

    def find(self, text: str) -> set[Agent]:
        """Agents of exactly that name, number or synonym."""
        return self.by_name.get(folded(text), set())

    def begins(self, text: str) -> set[Agent]:
        """Agents with a name that begins with that word."""
        start = folded(text)
        found: set[Agent] = set()
        for name, agents in self.by_name.items():
            if name.startswith(start) and not name[len(start) : len(start) + 1].isalnum():
                found |= agents
        return found


class WorkerBook:
    """Workers by personnel number and by name; two of one name are told apart by number."""

    def __init__(self, workers: Iterable[Worker]) -> None:
        self.by_number: dict[str, Worker] = {}
        self.by_name: dict[str, list[Worker]] = defaultdict(list)
        for worker in workers:
            self.by_number[folded(worker.personnel_number)] = worker
            self.by_name[folded(worker.name)].append(worker)

    def find(self, text: str) -> tuple[Worker | None, str]:
        """The worker and "", or None and why."""
        wanted = folded(text)
        if wanted in self.by_number:
            return self.by_number[wanted], ""
        same = self.by_name.get(wanted, [])
        if len(same) == 1:
            return same[0], ""
        if same:
            numbers = some(worker.personnel_number for worker in same)
            return None, f"{text!r} is the name of {len(same)} people; give the number: {numbers}."
        return None, f"{text!r} is not on the roster; give a personnel number or name of it."
