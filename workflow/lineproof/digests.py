"""Digests of files, so that what runs again depends on their content and never on their time stamps.

A file is read anew only where its size, its times or its inode differ from those of the last reading: gigabytes of
raw data cost nothing at a start that finds nothing to do.
"""

from __future__ import annotations

import hashlib
import json
import os
import time
from pathlib import Path

from lineproof import store
from lineproof.problems import KnownProblem, Problem
from lineproof.provenance import modules_named

# A file that changed this shortly before it was read may change again within one tick of the clock
# that stamps it, and look the same: its digest is not remembered.
_SETTLED = 2.0  # seconds


class Digests:
    """SHA-256 of files, remembered in the file `memory` together with the state each file was in."""

    def __init__(self, memory: str | os.PathLike) -> None:
        self._memory = Path(memory)
        self._known: dict[str, list] = _remembered(self._memory)
        self._seen: dict[str, list] = {}

    def of(self, path: str | os.PathLike) -> str:
        """Digest of a file's content, in hexadecimal.

        Raises KnownProblem when the file cannot be read.
        """
        name = os.path.abspath(path)
        try:
            state, known = _state(os.stat(name)), self._known.get(name)
            if known is not None and known[:-1] == state:
                self._seen[name] = known
                return known[-1]
            return self._read(name)
        except OSError as error:
            problem = Problem(
                str(path), f"cannot be read: {error.strerror}", "check the file and its permissions"
            )
            raise KnownProblem("A file is missing; nothing was run.", [problem]) from None

    def _read(self, name: str) -> str:
        with open(name, "rb") as file:
            before = os.fstat(file.fileno())
            digest = hashlib.file_digest(file, "sha256").hexdigest()
            after = os.fstat(file.fileno())
        unmoved = _state(before) == _state(after)
        if unmoved and time.time() - after.st_ctime > _SETTLED:
            self._seen[name] = [*_state(after), digest]
        return digest

    def keep(self) -> None:
        """Remember the files asked for since the start, and forget all others."""
        if self._seen != self._known:
            store.write_text(json.dumps(self._seen, indent=0, sort_keys=True), self._memory)


class ModulesNamed:
    """The modules that files of code name, remembered by the digest of their content: to parse them all takes longer
    than all else that an idle start does."""

    def __init__(self, memory: str | os.PathLike, digests: Digests) -> None:
        self._memory, self._digests = Path(memory), digests
        self._known: dict[str, list] = _remembered(self._memory)
        self._seen: dict[str, list] = {}

    def of(self, file: Path) -> list[str]:
        """See `provenance.modules_named`."""
        digest = self._digests.of(file)
        if digest not in self._seen:
            self._seen[digest] = self._known.get(digest) or modules_named(file)
        return self._seen[digest]

    def keep(self) -> None:
        """Remember the files asked for since the start, and forget all others."""
        if self._seen != self._known:
            store.write_text(json.dumps(self._seen, indent=0, sort_keys=True), self._memory)


def _state(found: os.stat_result) -> list[int]:
    """What changes with the content, whoever sets the time of writing back: `st_ctime` cannot be set."""
    return [found.st_size, found.st_mtime_ns, found.st_ino, found.st_ctime_ns]


def _remembered(memory: Path) -> dict[str, list]:
    """A memory that is lost or spoilt is no memory: files are then read anew."""
    try:
        known = json.loads(memory.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return known if isinstance(known, dict) else {}
