"""The README shows a study file that can be used as it stands."""

from __future__ import annotations

import re
from pathlib import Path

from lineproof.study import load_study

README = Path(__file__).parents[2] / "README.md"


def test_the_study_file_of_the_readme_is_sound(tmp_path: Path) -> None:
    (block,) = re.findall(r"```yaml\n(.*?)```", README.read_text(encoding="utf-8"), re.DOTALL)
    for name in ("returns.csv", "market.csv", "bills.csv"):
        (tmp_path / name).write_text("x", encoding="utf-8")
    (tmp_path / "study.yaml").write_text(block, encoding="utf-8")
    study = load_study(tmp_path / "study.yaml")
    assert (study.name, study.frequency, list(study.sorts)) == ("mine", "monthly", ["ten"])
