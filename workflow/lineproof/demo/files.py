"""The demo's tables as a vendor would deliver them: rows, and lines of comma-separated text."""

from __future__ import annotations

from math import isnan

import numpy as np
import pandas as pd

from lineproof.demo.exits import draw_exits
from lineproof.demo.securities import SECTORS, Panel
from lineproof.demo.series import MarketSeries

RETURN_COLUMNS = (
    "security", "date", "ret", "final_ret", "exit_code", "price", "size", "sector",
)  # fmt: skip


def draw_identifiers(rng: np.random.Generator, n_securities: int) -> np.ndarray:
    """Ascending six-digit identifiers with leading zeros and irregular gaps."""
    return np.array([f"{number:06d}" for number in np.cumsum(rng.integers(3, 24, n_securities))])


def security_rows(rng: np.random.Generator, panel: Panel, series: MarketSeries) -> pd.DataFrame:
    """One clean row a security and month listed, by security and date.

    Columns: security, date (ISO text), month (position), ret, final_ret (missing except in a
    leaver's last row), exit_code (empty likewise), price, size, sector, beta, residual_sd, is_first
    and is_last (of the security's rows).
    """
    who, when = np.nonzero(panel.listed.T)
    is_first = np.append(True, who[1:] != who[:-1])
    is_last = np.append(is_first[1:], True)
    leaves = is_last & (when < len(series.months) - 1)
    code, final = draw_exits(rng, panel.price[when[is_last], who[is_last]])
    identifiers = draw_identifiers(rng, panel.listed.shape[1])
    return pd.DataFrame(
        {
            "security": identifiers[who],
            "date": series.dates[when],
            "month": when,
            "ret": panel.ret[when, who],
            "final_ret": np.where(leaves, final[who], np.nan),
            "exit_code": np.where(leaves, code[who], ""),
            "price": panel.price[when, who],
            "size": panel.size[when, who],
            "sector": np.array(list(SECTORS))[panel.traits.sector][who],
            "beta": panel.beta[when, who],
            "residual_sd": panel.residual_sd[when, who],
            "is_first": is_first,
            "is_last": is_last,
        }
    )


def decimals(values: np.ndarray, places: int) -> list[str]:
    """Numbers as text with fixed decimals; missing is empty, and zero never has a sign."""
    rounded = np.round(np.asarray(values, dtype=float), places) + 0.0
    return ["" if isnan(value) else f"{value:.{places}f}" for value in rounded.tolist()]


def return_lines(rows: pd.DataFrame) -> list[str]:
    """The clean lines of returns.csv, without header and line ends."""
    columns = (
        rows["security"].tolist(),
        rows["date"].tolist(),
        decimals(rows["ret"], 6),
        decimals(rows["final_ret"], 6),
        rows["exit_code"].tolist(),
        decimals(rows["price"], 3),
        decimals(rows["size"], 3),
        rows["sector"].tolist(),
    )
    return [",".join(fields) for fields in zip(*columns, strict=True)]


def table_text(header: tuple[str, ...], *columns: list[str]) -> str:
    """Columns of text as one CSV text with a header and Unix line ends."""
    lines = [",".join(header), *(",".join(fields) for fields in zip(*columns, strict=True))]
    return "\n".join(lines) + "\n"


def market_text(series: MarketSeries) -> str:
    """market.csv: total return of the market in percent a month."""
    months = series.months.strftime("%Y-%m").tolist()
    return table_text(("month", "total_return"), months, decimals(100.0 * series.market, 4))


def riskless_text(series: MarketSeries) -> str:
    """riskless.csv: yearly yield in percent that holds for the month."""
    months = series.months.strftime("%Y-%m").tolist()
    return table_text(("month", "annual_yield"), months, decimals(100.0 * series.annual_yield, 4))


def sector_text(panel: Panel, series: MarketSeries) -> str:
    """sector_indices.csv: size-weighted total returns in percent, by asset and month."""
    months = series.months.strftime("%Y-%m").tolist()
    names, returns = [], []
    for position, name in enumerate(SECTORS):
        weight = panel.weight * (panel.traits.sector == position)
        index = (weight * panel.ret).sum(axis=1) / weight.sum(axis=1)
        names += [name] * len(months)
        returns += decimals(100.0 * index, 4)
    return table_text(("asset", "month", "ret"), names, months * len(SECTORS), returns)
