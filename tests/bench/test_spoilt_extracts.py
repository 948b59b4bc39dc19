"""Two thousand spoilt extracts through the whole intake; prints how they ended."""

from __future__ import annotations

from pathlib import Path

from tests.properties.test_spoilt_extracts import ENDINGS, outcomes

N_FILES = 2000


def test_two_thousand_spoilt_extracts(tmp_path: Path) -> None:
    for ending, share in ENDINGS.items():
        seen = outcomes(tmp_path, ending, int(N_FILES * share))
        print(f"\n{ending}: {seen['panel']} spoilt files gave a panel, {seen['stop']} a stop")
