"""Digests of files: what is read anew, and when."""

from __future__ import annotations

import hashlib
import os
import time
from pathlib import Path

import pytest

from lineproof import digests as module
from lineproof.digests import Digests
from lineproof.problems import KnownProblem


@pytest.fixture
def file(tmp_path: Path) -> Path:
    path = tmp_path / "returns.csv"
    path.write_text("one\n")
    return path


@pytest.fixture
def settled(monkeypatch: pytest.MonkeyPatch) -> None:
    """Files count as settled at once, so that their digests are remembered."""
    monkeypatch.setattr(module, "_SETTLED", -1.0)


def remembering(file: Path) -> Path:
    memory = file.with_name("known.json")
    digests = Digests(memory)
    digests.of(file)
    digests.keep()
    return memory


def counted(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The files that are read from now on."""
    read: list[str] = []
    plain = Digests._read
    monkeypatch.setattr(Digests, "_read", lambda self, name: read.append(name) or plain(self, name))
    return read


def test_the_digest_is_that_of_the_content(file: Path) -> None:
    assert Digests(file.with_name("known.json")).of(file) == hashlib.sha256(b"one\n").hexdigest()


@pytest.mark.usefixtures("settled")
def test_an_unchanged_file_is_not_read_again(file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    memory, read = remembering(file), counted(monkeypatch)
    assert Digests(memory).of(file) == hashlib.sha256(b"one\n").hexdigest()
    assert read == []


@pytest.mark.usefixtures("settled")
@pytest.mark.parametrize("shift", [-(10**15), 0, 10**15], ids=["older", "equal", "newer"])
@pytest.mark.parametrize("replace", [True, False], ids=["replaced", "overwritten"])
def test_other_content_of_the_same_size_is_noticed(file: Path, shift: int, replace: bool) -> None:
    memory, before = remembering(file), file.stat()
    time.sleep(0.02)  # more than a tick of the clock that stamps files
    if replace:
        other = file.with_name("delivered.csv")
        other.write_text("two\n")
        other.replace(file)
    else:
        file.write_text("two\n")
    os.utime(file, ns=(before.st_atime_ns, before.st_mtime_ns + shift))
    assert Digests(memory).of(file) == hashlib.sha256(b"two\n").hexdigest()


def test_a_file_that_has_just_changed_is_read_again(
    file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Within one tick of the clock it could change once more and look the same."""
    monkeypatch.setattr(module, "_SETTLED", 3600.0)
    memory, read = remembering(file), counted(monkeypatch)
    Digests(memory).of(file)
    assert read == [str(file)]


@pytest.mark.parametrize("spoilt", ["", "{", "[]", "\xff"])
def test_a_spoilt_memory_is_no_memory(file: Path, spoilt: str) -> None:
    memory = file.with_name("known.json")
    memory.write_bytes(spoilt.encode("latin-1"))
    assert Digests(memory).of(file) == hashlib.sha256(b"one\n").hexdigest()


def test_a_file_that_cannot_be_read_is_a_problem_of_the_user(tmp_path: Path) -> None:
    with pytest.raises(KnownProblem, match=r"absent\.csv: cannot be read: No such file"):
        Digests(tmp_path / "known.json").of(tmp_path / "absent.csv")


@pytest.mark.usefixtures("settled")
def test_modules_named_are_those_of_the_content(tmp_path: Path) -> None:
    code, memory = tmp_path / "a.py", tmp_path / "named.json"
    code.write_text("from lineproof import store\n")

    def named() -> list[str]:
        found = module.ModulesNamed(memory, Digests(tmp_path / "known.json"))
        names = found.of(code)
        found.keep()
        return names

    assert named() == ["lineproof", "lineproof.store"]
    memory.write_text(memory.read_text().replace("lineproof.store", "lineproof.kept"))
    assert named() == ["lineproof", "lineproof.kept"]  # from memory: it is not parsed again
    code.write_text("X = 'lineproof.periods:Months'\n")
    module.modules_named.cache_clear()
    assert named() == ["lineproof.periods"]
    memory.write_text("{")
    assert named() == ["lineproof.periods"]
