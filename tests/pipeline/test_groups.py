"""What a run says of its groups, against the members that it wrote."""

from __future__ import annotations

from collections import defaultdict
from itertools import pairwise

import pandas as pd
import pytest
from tests.pipeline.conftest import Project

from lineproof.addresses import address


def test_the_estimates_say_where_the_members_went(finished: Project) -> None:
    """From the table of members, one formation and security at a time; a mean of at most ten shares is exact to a few
    units of the last place."""
    members = pd.read_parquet(finished.results / "portfolios" / "five" / "members.parquet")
    where: dict[pd.Timestamp, dict[str, str]] = defaultdict(dict)
    for row in members.itertuples():
        where[row.formed][row.security] = row.asset
    assets = [f"p{n:02d}" for n in range(1, 6)]
    shares: dict[tuple[str, str], list[float]] = defaultdict(list)
    for earlier, later in pairwise(where[formed] for formed in sorted(where)):
        for start in assets:
            who = [each for each, asset in earlier.items() if asset == start]
            for end in (*assets, "out"):
                here = [each for each in who if later.get(each, "out") == end]
                shares[start, end].append(len(here) / len(who))
    estimates = pd.read_parquet(finished.results / "estimates.parquet")
    found = dict(zip(address(estimates), estimates["estimate"], strict=True))
    assert len(shares) == 30
    for (start, end), values in shares.items():
        mean = sum(values) / len(values)
        assert found[f"five/-/transitions/-/{start}/{end}/-"] == pytest.approx(mean, abs=1e-14)
    counts = members.groupby(["formed", "asset"], observed=True).size()
    assert found["five/-/formations/-/p02/max_members/-"] == counts.xs("p02", level=1).max()


def test_supplied_assets_have_no_numbers_or_tables_of_groups(finished: Project) -> None:
    estimates = pd.read_parquet(finished.results / "estimates.parquet")
    of_groups = estimates[estimates["analysis"].isin(["formations", "transitions"])]
    assert set(of_groups["sort"]) == {"five", "five_size"}
    names = {file.stem for file in finished.files("tables")}
    assert {"groups_at_formation", "group_moves-five_size"} <= names
    assert not {"groups_at_formation-sectors", "group_moves-sectors"} & names
