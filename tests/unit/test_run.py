"""Setting up the environment: when it is made anew, and what is said when that fails."""

from __future__ import annotations

import importlib.util
import subprocess
from pathlib import Path
from types import ModuleType

import pytest

from lineproof.provenance import WORKFLOW


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """`workflow/run.py` with an environment and pins of its own; installing only leaves a mark."""
    spec = importlib.util.spec_from_file_location("run", WORKFLOW / "run.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    pins = {kind: tmp_path / f"{kind}.txt" for kind in ("run", "test")}
    for kind, path in pins.items():
        path.write_text(f"{kind} 1")
    environment = tmp_path / "environment"
    monkeypatch.setattr(module, "ENVIRONMENT", environment)
    monkeypatch.setattr(module, "PYTHON", environment / "bin" / "python")
    monkeypatch.setattr(module, "PINS", pins)
    monkeypatch.setattr(module, "_run", lambda *words, may_fail=False: None)
    monkeypatch.setattr(module.venv, "EnvBuilder", Builder)
    Builder.cleared.clear()
    return module


class Builder:
    """Makes an empty environment, and notes whether the old one was cleared away."""

    cleared: list[bool] = []  # noqa: RUF012

    def __init__(self, *, with_pip: bool, clear: bool) -> None:
        assert with_pip
        self.cleared.append(clear)

    def create(self, folder: Path) -> None:
        (folder / "bin").mkdir(parents=True, exist_ok=True)
        (folder / "bin" / "python").touch()


def test_an_environment_that_stands_is_left_alone(run: ModuleType) -> None:
    assert run.set_up("run") == run.set_up("run") == ""
    assert Builder.cleared == [True]


def test_packages_for_tests_come_on_top_and_serve_runs_too(run: ModuleType) -> None:
    for kind in ("run", "test", "test", "run"):
        assert run.set_up(kind) == ""
    assert Builder.cleared == [True, False]


@pytest.mark.parametrize("kind", ["run", "test"])
def test_other_pins_of_a_run_make_any_environment_anew(run: ModuleType, kind: str) -> None:
    """So a package that is no longer pinned is gone, and a run never goes on under old pins of a test."""
    run.set_up(kind)
    run.PINS["run"].write_text("run 2")
    run.set_up("run")
    assert Builder.cleared == [True, True]


@pytest.mark.parametrize("where", ["output", "stderr"])
def test_a_missing_package_of_the_system_is_named(
    run: ModuleType, monkeypatch: pytest.MonkeyPatch, where: str
) -> None:
    """Debian's Python without python3-venv; what it says is in `output`."""
    said = "The virtual environment was not created because ensurepip is not available."

    def fail(self: Builder, folder: Path) -> None:
        raise subprocess.CalledProcessError(1, ["ensurepip"], **{where: said})

    monkeypatch.setattr(Builder, "create", fail)
    found = run.set_up("run")
    assert said in found
    assert "apt install python3-venv" in found


def test_any_other_failure_is_said_in_its_own_words(
    run: ModuleType, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*words: object, may_fail: bool = False) -> None:
        raise subprocess.CalledProcessError(1, ["pip"], stderr="one\ntwo\nno space left\n")

    monkeypatch.setattr(run, "_run", fail)
    assert run.set_up("run").endswith("one\n  two\n  no space left")
