"""The same inputs give the same bytes, whatever the cores, the time zone and the hash seed."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from tests.pipeline.conftest import ROOT, Project, copy_program

PARTS = (
    *("raw", "data", "betas", "portfolios", "subperiods", "pricing", "tables", "figures"),
    *("estimates.parquet", "estimates.csv", "report.html"),
)


class Demo(Project):
    """The demo study in a copy of the program."""

    @property
    def results(self) -> Path:
        return self.folder / "results" / "kestrel"


@pytest.fixture(scope="module")
def demos(tmp_path_factory: pytest.TempPathFactory) -> list[Demo]:
    """Two fresh runs of the demo that differ in everything numbers must not depend on."""
    made = []
    for _ in range(2):
        folder = copy_program(tmp_path_factory.mktemp("demo") / "project").folder
        shutil.copytree(ROOT / "config", folder / "config")
        made.append(Demo(folder))
    settings = ((1, "Pacific/Auckland", "1"), (2, "America/St_Johns", "2"))
    for demo, (cores, zone, seed) in zip(made, settings, strict=True):
        result = demo.lineproof("study", cores=cores, TZ=zone, PYTHONHASHSEED=seed)
        assert result.status == 0, result.text
    return made


@pytest.mark.thorough
def test_one_core_and_two_give_the_same_bytes(demos: list[Demo]) -> None:
    one, two = (demo.hashes(*PARTS) for demo in demos)
    assert len(one) > 60
    assert {name for name in one if one[name] != two.get(name)} == set()
    assert one.keys() == two.keys()


@pytest.mark.thorough
def test_no_output_names_the_machine(demos: list[Demo]) -> None:
    """Nothing that is passed on holds a path of the machine it was made on."""
    folder = str(demos[0].folder).encode()
    assert [str(f) for f in demos[0].files(*PARTS) if folder in f.read_bytes()] == []
