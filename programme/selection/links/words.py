"""Building mismatches: clause and mark come from the rule pack, never from here."""

from programme.rulepack.pack import RulePack
from programme.selection.chain import FIX, PLAN, STOP, Mismatch, Remedy


class Finder:
    """Makes the mismatches of one link under one rule pack."""

    def __init__(self, pack: RulePack, link: str) -> None:
        self._pack, self._link = pack, link

    def _make(self, severity: str, code: str, says: str, *remedies: Remedy, **more) -> Mismatch:
        clause = self._pack.clause(more.pop("clause", code))
        return Mismatch(
            code=code,
            severity=severity,
            link=self._link,
            says=says,
            remedies=remedies,
            source=more.pop("source", clause.source),
            sure=more.pop("sure", clause.sure),
            **more,
        )

    def stop(self, code: str, says: str, *remedies: Remedy, **more) -> Mismatch:
        """No work under this assignment."""
        return self._make(STOP, code, says, *remedies, **more)

    def fix(self, code: str, says: str, *remedies: Remedy, **more) -> Mismatch:
        """Correct before next use."""
        return self._make(FIX, code, says, *remedies, **more)

    def plan(self, code: str, says: str, *remedies: Remedy, **more) -> Mismatch:
        """Correct on a dated plan."""
        return self._make(PLAN, code, says, *remedies, **more)
