"""The process in which jobs run."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

import lineproof
from lineproof.environment import kernels_digest, settle

PACKAGE = Path(lineproof.__file__).parent


@pytest.mark.parametrize("module", ["stats/window_alone.py", "intake/plain.py"])
def test_kernels_are_kept_by_all_code_they_may_be_built_of(tmp_path: Path, module: str) -> None:
    for folder in ("stats", "intake"):
        shutil.copytree(PACKAGE / folder, tmp_path / folder)
    assert kernels_digest(tmp_path) == kernels_digest(PACKAGE)
    with (tmp_path / module).open("a", encoding="utf-8") as file:
        file.write("# changed\n")
    assert kernels_digest(tmp_path) != kernels_digest(PACKAGE)


def test_every_kernel_lies_where_it_is_looked_for() -> None:
    holds = {file for file in PACKAGE.rglob("*.py") if "njit" in file.read_text(encoding="utf-8")}
    assert holds
    parts = {file.relative_to(PACKAGE).parts[0] for file in holds}
    assert parts <= {"stats", "intake", "environment.py"}


def test_a_chosen_folder_stays() -> None:
    environ = {"NUMBA_CACHE_DIR": "mine"}
    settle(environ)
    assert environ["NUMBA_CACHE_DIR"] == "mine"
