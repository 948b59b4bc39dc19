"""A daily study: each stage below the intake on tables of days, and a whole run."""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests import daily_market
from tests.pipeline.conftest import Project, copy_program

from lineproof import store
from lineproof.estimation import estimates_of
from lineproof.formation_summary import describe_sorts
from lineproof.forming import form_portfolios
from lineproof.frames import contract
from lineproof.gathering import gather_estimates
from lineproof.paper import exhibits
from lineproof.paper.context import Context
from lineproof.paper.figures import draw_figures
from lineproof.paper.report import write_report
from lineproof.paper.tables import write_tables
from lineproof.periods import periods_of
from lineproof.pricing import price_subperiod
from lineproof.sampling import describe_sample
from lineproof.study import load_study
from lineproof.subperiods import cut_subperiods, listed
from lineproof.wiring import Wiring

INTAKE: dict[str, Any] = {
    **dict.fromkeys(("rows_read", "rows_kept"), 1000),
    **dict.fromkeys(("rows_set_aside", "exact_duplicates", "rows_screened"), 0),
    "faults": [],
    "screens": [],
    "span": [],
}


@dataclass
class Made:
    """What the stages below the intake make of the small daily study."""

    panel: pd.DataFrame
    market: pd.DataFrame
    betas: pd.DataFrame
    returns: dict[str, pd.DataFrame]
    members: dict[str, pd.DataFrame]
    index: list[dict[str, Any]]
    cuts: dict[str, pd.DataFrame]
    context: Context


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Made:
    """The stages one after another, with the options that the wiring gives them."""
    folder = tmp_path_factory.mktemp("daily")
    daily_market.write_files(folder / "raw")
    (folder / "small.yaml").write_text(daily_market.STUDY, encoding="utf-8")
    wiring = Wiring(load_study(folder / "small.yaml"))
    panel, market = daily_market.tables()
    store.write_table(panel, folder / "panel.parquet", "panel", "daily")
    panel = store.read_table(folder / "panel.parquet")
    betas = estimates_of(panel, market, **wiring.options("estimate_betas-days120"))
    store.write_table(betas, folder / "betas.parquet", "betas", "daily")
    sources = [str(folder / "panel.parquet"), str(folder / "betas.parquet")]
    sorts = {
        name: form_portfolios(sources, market, **wiring.options(f"form_portfolios-{name}"))
        for name in ("four", "four_size")
    }
    for each in sorts.values():
        contract("members", "daily").validate(each.members)
        contract("portfolio_returns", "daily").validate(each.returns)
    returns = {name: each.returns for name, each in sorts.items()}
    options = dict(wiring.options("cut_subperiods"))
    frequency = options.pop("frequency")
    subperiods, cuts = cut_subperiods(returns, market, **options)
    for cut in cuts.values():
        contract("subperiod", "daily").validate(cut)
    index = json.loads(json.dumps(listed(subperiods, market, frequency)))
    periods = periods_of(frequency, market["date"].to_numpy())
    parts = [describe_sample(panel, betas, index, INTAKE, periods)]
    formed = [table for each in sorts.values() for table in (each.formations, each.transitions)]
    hold = wiring.options("describe_sample")["hold"]
    parts += describe_sorts(hold, formed, panel["date"].max())
    parts += [
        price_subperiod(cut, subperiod=name, **wiring.options("price_subperiod"))
        for name, cut in cuts.items()
    ]
    estimates = contract("estimates").validate(gather_estimates(parts))
    context = Context(estimates, index, wiring.options("write_paper")["facts"], INTAKE)
    members = {name: each.members for name, each in sorts.items()}
    return Made(panel, market, betas, returns, members, index, cuts, context)


def test_estimates_and_groups_are_made_on_last_trading_days(made: Made) -> None:
    days = made.market["date"]
    last = days.groupby([days.dt.year, days.dt.month]).max()
    assert set(made.betas["date"]) <= set(last)
    decembers = last[last.dt.month == 12]
    for members in made.members.values():
        # The last December has no return after it, and is listed all the same.
        assert members["formed"].unique().tolist() == decembers.tolist()
    for returns in made.returns.values():
        first = days[days > decembers.iloc[0]].min()
        assert returns["date"].unique().tolist() == days[days >= first].tolist()


def test_the_equally_weighted_group_of_one_day_by_hand(made: Made) -> None:
    day = pd.Timestamp("2003-05-15")
    members = made.members["four"].query("formed < '2003-01-01' and asset == 'p02'")
    members = members[members["formed"] == members["formed"].max()]["security"]
    rows = made.panel[(made.panel["date"] == day) & made.panel["security"].isin(members)]
    found = made.returns["four"].query("date == @day and asset == 'p02'").iloc[0]
    # A mean of about ten returns.
    assert found["excess_return"] == pytest.approx(rows["excess_return"].mean(), rel=1e-12)
    assert found["n_members"] == rows["excess_return"].notna().sum()


def test_a_subperiod_holds_every_day_of_its_months(made: Made) -> None:
    days = made.market["date"]
    assert [(s["first"], s["last"]) for s in made.index] == [
        ("2002-01", "2003-12"),
        ("2003-01", "2003-12"),
    ]
    for each, year in zip(made.index, (2002, 2003), strict=True):
        inside = days[days.dt.year >= year]
        assert each["n_periods"] == len(inside)
        cut = made.cuts[each["name"]]
        assert cut["date"].unique().tolist() == inside.tolist()


def test_numbers_count_days(made: Made) -> None:
    book, n_days = made.context.book, made.index[0]["n_periods"]
    market = made.market[made.market["date"].dt.year >= 2002]["market_excess"]
    mean = book.at("four", "full", "describe", "-", "market", "mean", "-")
    assert (mean.n_periods, mean.df1) == (n_days, n_days - 1)
    assert mean.estimate == pytest.approx(market.mean(), rel=1e-12)
    assert book.at("-", "full", "sample", "panel", "all", "n_periods", "-").estimate == n_days
    alpha = book.at("four", "full", "time_series", "market", "p01", "alpha", "hac")
    a_year = book.at("four", "full", "time_series", "market", "p01", "alpha_year", "-")
    assert a_year.estimate == pytest.approx(252 * alpha.estimate, rel=1e-12)
    last = made.panel[made.panel["date"] == made.market["date"].max()]
    alive = book.at("-", "-", "sample", "month", "2003-12", "n_securities", "-")
    assert alive.estimate == len(last)


def test_the_paper_speaks_of_days(made: Made) -> None:
    figures = draw_figures(made.context)
    assert set(figures) == set(exhibits.figure_files(made.context.facts))
    texts = [write_report(made.context, figures), *write_tables(made.context).values()]
    # Months remain where groups are held for twelve of them.
    monthly = re.compile(r"monthly|(?<!12 )\bmonths?\b", re.IGNORECASE)
    for text in texts:
        words = re.sub(r"<svg.*?</svg>|<[^>]*>", " ", text, flags=re.DOTALL)
        words = words.replace("at the end of each month", "")
        assert monthly.findall(words) == [], monthly.search(words)
    everything = " ".join(re.sub(r"\s+", " ", re.sub(r"<[^>]*>", "", text)) for text in texts)
    for said in (
        "Daily returns on a small invented market",
        "ranked on the beta of their last 120 trading days",
        "rebalanced daily",
        "weighted by size at the end of the day before",
        "in per cent a day",
        "Alive on a day",
        "Security-days",
    ):
        assert said in everything, said


def test_means_of_days_print_with_four_digits(made: Made) -> None:
    table = write_tables(made.context)["market_line.csv"]
    slope = made.context.book.at(
        *("four", "full", "market_line", "ols", "all", "slope", "errors_in_variables")
    )
    assert re.search(rf"(?<!\d){100 * slope.estimate:.4f}(?!\d)", table)
    assert np.isfinite(slope.estimate)


@pytest.mark.thorough
def test_a_whole_run(tmp_path: Path, made: Made) -> None:
    project: Project = copy_program(tmp_path / "project", daily_market.STUDY)
    daily_market.write_files(project.folder / "raw")
    project.run()
    for name in ("four", "four_size"):
        found = store.read_table(project.results / "portfolios" / name / "returns.parquet")
        pd.testing.assert_frame_equal(found, made.returns[name])
    assert "Daily returns" in (project.results / "tables" / "sample.html").read_text()
    assert project.run().steps == []
