"""The display of a run on the terminal: one line a step, or one line rewritten where the terminal allows it."""

from __future__ import annotations

import shutil
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import TextIO

from lineproof.joblog import MESSAGE_ENDING, without_message

_TARGETS = {"study", "data"}


class Progress:
    """Steps done and running, and the failures met. One run a process."""

    def __init__(self, stream: TextIO | None = None) -> None:
        self.stream = stream or sys.stderr
        self.running: dict[int, str] = {}
        self.done, self.total = 0, 0
        self.failures: list[str] = []
        self.other: list[str] = []

    def planned(self, stats: Mapping[str, int]) -> None:
        """The scheduler's count of jobs by rule; targets are no steps."""
        steps = sum(n for rule, n in stats.items() if rule not in {*_TARGETS, "total"})
        self.total = max(self.total, self.done + steps)

    def started(self, job: int, rule: str, wildcards: Mapping[str, str]) -> None:
        """A job begins."""
        if rule in _TARGETS:
            return
        self.running[job] = " ".join([rule.replace("_", " "), *map(str, wildcards.values())])
        if self._rewrites():
            self._rewrite()
        else:
            self._line(f"{self._count(self.done + len(self.running))} {self.running[job]}")

    def finished(self, job: int) -> None:
        """A job is done."""
        if self.running.pop(job, None) is not None:
            self.done += 1
            if self._rewrites():
                self._rewrite()

    def counted(self, done: int, total: int) -> None:
        """The scheduler's own count, which grows once the subperiods are known; it counts the target too."""
        self.total = max(self.done, self.done + total - done - 1)

    def failed(self, rule: str, logs: list[str]) -> None:
        """A job failed: its message is shown, and where its log is."""
        name = rule.replace("_", " ")
        for log in logs:
            message = Path(log).with_suffix(MESSAGE_ENDING)
            said = message.read_text(encoding="utf-8").rstrip() if message.exists() else ""
            said = said or without_message(log)
            self.failures.append(f"{said}\n  (step: {name}; log: {log})")

    def said(self, text: str) -> None:
        """Any other error of the scheduler."""
        if text and text != "None":
            self.other.append(text)

    def end(self) -> bool:
        """Clear the rewritten line, and show what failed; whether there was something to show."""
        if self._rewrites() and self.done:
            print("\r\033[K", end="", file=self.stream)
        for text in self.failures or self.other:
            self._line(text)
        return bool(self.failures or self.other)

    def _count(self, step: int) -> str:
        total = max(self.total, step)
        return f"[{step:>{len(str(total))}}/{total}]"

    def _rewrites(self) -> bool:
        return self.stream.isatty()

    def _rewrite(self) -> None:
        text = f"{self._count(self.done)} {', '.join(self.running.values())}"
        width = shutil.get_terminal_size().columns - 1
        print(f"\r\033[K{text[:width]}", end="", file=self.stream, flush=True)

    def _line(self, text: str) -> None:
        print(text, file=self.stream, flush=True)


CURRENT = Progress()
