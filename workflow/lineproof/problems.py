"""Problems a user can mend: said in one clear message, never as a traceback."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Problem:
    """What is wrong (`found`), `where`, and what to change (`change`)."""

    where: str
    found: str
    change: str = ""

    def __str__(self) -> str:
        return f"{self.where}: {self.found}" + (f"\n    → {self.change}" if self.change else "")


class KnownProblem(Exception):
    """Raised with every problem found at once; its text is the message a user sees."""

    def __init__(self, headline: str, problems: list[Problem]) -> None:
        self.headline = headline
        self.problems = list(problems)
        super().__init__("\n".join([headline, *(f"  {p}" for p in self.problems)]))

    def __reduce__(self) -> tuple:
        return (KnownProblem, (self.headline, self.problems))
