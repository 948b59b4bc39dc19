"""The designs in config/published_designs.yaml on the invented market: what each publication says of its groups.

Black, Jensen and Scholes 1972; Fama and MacBeth 1973, "Risk, Return, and Equilibrium: Empirical Tests"; Fama and
French 1992, "The Cross-Section of Expected Stock Returns".
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from tests.pipeline.conftest import ROOT

from lineproof import store
from lineproof.demo import make_demo
from lineproof.demo_files import RAW
from lineproof.estimation import estimates_of
from lineproof.forming import form_portfolios
from lineproof.frames import contract
from lineproof.sorting import Sorted
from lineproof.specs import Study
from lineproof.stats.sorts import by_equal_counts, group_sizes
from lineproof.study import load_study
from lineproof.validation import validate_returns
from lineproof.wiring import Wiring

SETS_BREAKPOINTS = ["energy", "machinery", "financials"]
BJS, FM, FF = "black_jensen_scholes_1972", "fama_macbeth_1973", "fama_french_1992"


@pytest.fixture(scope="module")
def study() -> Study:
    return load_study(ROOT / "config" / "published_designs.yaml")


@pytest.fixture(scope="module")
def tables(tmp_path_factory: pytest.TempPathFactory, study: Study) -> dict[str, pd.DataFrame]:
    """The demo market after its intake, and the betas that the study file asks for."""
    raw = tmp_path_factory.mktemp("raw")
    store.write_files({n: text for n, text in make_demo(**study.demo).items() if n in RAW}, raw)
    wiring = Wiring(study)
    files = {
        name: [str(raw / Path(file).name) for file in paths]
        for name, paths in wiring.raw_files.items()
    }
    with store.Scratch(raw) as scratch:
        taken = validate_returns(files, scratch, **wiring.options("validate_returns"))
        panel = pd.concat([batch["panel"] for batch in taken.tables()], ignore_index=True)
        market = taken.markets()["market"]
    found = {"panel": panel, "market": market}
    for name in study.betas:
        found[name] = estimates_of(panel, market, **wiring.options(f"estimate_betas-{name}"))
    return found


@pytest.fixture(scope="module")
def formed(
    tmp_path_factory: pytest.TempPathFactory, study: Study, tables: dict[str, pd.DataFrame]
) -> dict[str, Sorted]:
    folder = tmp_path_factory.mktemp("published")
    for name, table in tables.items():
        store.write_table(table, folder / f"{name}.parquet", None)
    found = {}
    for name in study.sorts:
        options = Wiring(study).options(f"form_portfolios-{name}")
        sources = [str(folder / f"{each}.parquet") for each in ("panel", *options["estimates"])]
        found[name] = form_portfolios(sources, tables["market"], **options)
        for table, frame in found[name].tables().items():
            contract(table).validate(frame)
    return found


def counts(found: Sorted) -> pd.DataFrame:
    """Members by formation and group."""
    return found.formations.pivot(index="formed", columns="asset", values="n_members")


def test_the_file_names_the_designs(study: Study) -> None:
    assert list(study.sorts) == [BJS, FM, FF]


def test_black_jensen_scholes_forms_ten_groups_each_year(formed: dict[str, Sorted]) -> None:
    each = counts(formed[BJS])
    assert each.shape[1] == 10
    assert set(each.index.month) == {12}
    assert (np.diff(each.index.year) == 1).all()
    assert each.index[0] == pd.Timestamp("1971-12-31")  # after the first 24 months


def test_the_sizes_of_fama_macbeth_groups() -> None:
    """Of 435 securities, the number in the first period (from memory of table 1; the sizes follow from the rule).

    int(435 / 20) = 21 leaves 15: 7 for the first, and 7 and the odd one for the last.
    """
    assert group_sizes(435, 20).tolist() == [28, *[21] * 18, 29]
    assert group_sizes(576, 20).tolist() == [36, *[28] * 18, 36]  # the second period, from memory
    for n in range(20, 1000):
        assert group_sizes(n, 20).sum() == n
    ranked = by_equal_counts(np.random.default_rng(1).normal(size=435), 20, np.ones(435, bool))
    assert np.bincount(ranked)[1:].tolist() == [28, *[21] * 18, 29]


def test_fama_macbeth_blocks(formed: dict[str, Sorted]) -> None:
    each = counts(formed[FM])
    assert set(each.index.month) == {12}
    assert (np.diff(each.index.year) == 4).all()
    # Four years of the first window at least, then five: 1970 to 1973 and 1974 to 1978.
    assert each.index[0] == pd.Timestamp("1978-12-31")
    for _, sizes in each.iterrows():
        assert sizes.tolist() == group_sizes(int(sizes.sum()), 20).tolist()
    returns = formed[FM].returns
    assert returns["date"].min() == pd.Timestamp("1979-01-31")
    assert returns["excess_return"].notna().all()


def test_fama_macbeth_ranks_on_the_first_window_and_weighs_the_later_ones(
    formed: dict[str, Sorted], tables: dict[str, pd.DataFrame]
) -> None:
    members = formed[FM].members.astype({"security": str, "asset": str})
    at = members["formed"].unique()[0]
    here = members[members["formed"] == at].set_index("security")
    first = tables["formation84"].astype({"security": str}).set_index(["date", "security"])["beta"]
    ranking = first.loc[at - pd.DateOffset(years=5) + pd.offsets.MonthEnd(0)]
    spans = ranking[here.index].groupby(here["asset"]).agg(["min", "max"])
    assert (spans["max"].to_numpy()[:-1] < spans["min"].to_numpy()[1:]).all()
    # In the third year the betas of 84 months that were known at the end of the second.
    year = at + pd.DateOffset(years=2)
    later = tables["complete84"].set_index(["date", "security"])["beta"].loc[year]
    month = year + pd.offsets.MonthEnd(1)
    panel = tables["panel"]
    alive = panel.loc[panel["date"] == month, "security"]
    lowest = here.index[here["asset"] == "p01"].intersection(alive)
    assert later.index.isin(lowest).sum() == len(lowest)
    returns = formed[FM].returns.set_index(["asset", "date"])
    # A mean of a few dozen numbers in another order.
    assert returns.loc[("p01", month), "ante_beta"] == pytest.approx(
        later[lowest].mean(), rel=1e-13
    )


def test_fama_french_sorts_by_size_and_inside_by_beta(
    formed: dict[str, Sorted], tables: dict[str, pd.DataFrame]
) -> None:
    members = formed[FF].members.astype({"security": str, "asset": str})
    assert set(members["formed"].dt.month) == {6}
    sector = tables["panel"].astype({"security": str}).groupby("security")["sector"].first()
    here = members[members["formed"] == members["formed"].max()]
    marks = here[here["security"].map(sector).isin(SETS_BREAKPOINTS)]
    sizes = np.quantile(marks["size"], [0.2, 0.4, 0.6, 0.8])
    of_size = np.searchsorted(sizes, here["size"]) + 1
    assert here["asset"].str[1:3].astype(int).tolist() == of_size.tolist()
    for group in range(1, 6):
        inner = here[of_size == group]
        marked = inner["security"].map(sector).isin(SETS_BREAKPOINTS)
        cuts = np.quantile(inner.loc[marked, "ante_beta"], [0.2, 0.4, 0.6, 0.8])
        got = inner["asset"].str[4:].astype(int).tolist()
        assert got == (np.searchsorted(cuts, inner["ante_beta"]) + 1).tolist()


def test_fama_french_betas_of_the_full_period(
    formed: dict[str, Sorted], tables: dict[str, pd.DataFrame]
) -> None:
    found = formed[FF]
    returns = found.returns.merge(tables["market"], on="date").dropna(subset="excess_return")
    slopes = {
        asset: np.polyfit(rows["market_excess"], rows["excess_return"], 1)[0]
        for asset, rows in returns.groupby("asset")
    }
    members = found.members.astype({"security": str, "asset": str})
    last = members[members["formed"] == members["formed"].max()].set_index("security")["asset"]
    assigned = found.assigned.astype({"security": str})
    rows = assigned[assigned["date"] == found.returns["date"].max()]
    # Two ways to one regression.
    expected = [slopes[last[security]] for security in rows["security"]]
    np.testing.assert_allclose(rows["beta"], expected, rtol=1e-9)
    assert rows["security"].nunique() == len(rows) > 100


def test_fama_french_spreads(formed: dict[str, Sorted]) -> None:
    wide = formed[FF].returns.pivot(index="date", columns="asset", values="excess_return")
    first = wide["p01-05"] - wide["p01-01"]
    pd.testing.assert_series_equal(first, wide["spread-01"], check_names=False)
    every = wide[[f"spread-{group:02d}" for group in range(1, 6)]]
    # A mean of five numbers in another order.
    np.testing.assert_allclose(
        every.mean(axis=1, skipna=False), wide["spread"], rtol=1e-12, atol=1e-16
    )
