"""The contract between stages: one pandera schema for each table on disk.

Dates of a monthly table are month ends, those of a daily one any days: see `contract`.
Nothing is coerced or dropped here: a frame that does not fit is an error of ours, found where it is written.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pandas as pd
import pandera.pandas as pa

from lineproof.addresses import KEY_COLUMNS


def _text(**options: object) -> pa.Column:
    return pa.Column(str, nullable=False, **options)


def _name() -> pa.Column:
    """Text, or a categorical of text: a large table holds each name once."""
    return pa.Column(None, pa.Check(_is_text, name="is text"), nullable=False)


def _is_text(column: pd.Series) -> bool:
    dtype = column.dtype
    if isinstance(dtype, pd.CategoricalDtype):
        dtype = dtype.categories.dtype
    return isinstance(dtype, pd.StringDtype)


def _number(*checks: pa.Check, nullable: bool = True) -> pa.Column:
    return pa.Column(float, list(checks), nullable=nullable)


def _count() -> pa.Column:
    return pa.Column("int64", pa.Check.ge(0))


def _month_end(dates: pd.Series) -> bool:
    return bool(dates.dt.is_month_end.all())


def _whole_day(dates: pd.Series) -> bool:
    return bool((dates == dates.dt.normalize()).all())


def _ranks(column: pd.Series) -> np.ndarray:
    """Numbers in the order of text by code point; int (n_rows,)."""
    if not isinstance(column.dtype, pd.CategoricalDtype):
        return pd.factorize(column, sort=True)[0]
    names = column.cat.categories.to_series(index=range(len(column.cat.categories)))
    return pd.factorize(names, sort=True)[0][column.cat.codes.to_numpy()]


def _sorted_unique(*keys: str) -> pa.Check:
    """Rows strictly increase in `keys`: sorted and unique, checked by comparing neighbours."""

    def increases(frame: pd.DataFrame) -> bool:
        below = pd.Series(False, index=frame.index)
        tied = pd.Series(True, index=frame.index)
        for key in keys:
            column = frame[key]
            if _is_text(column):
                column = pd.Series(_ranks(column), index=frame.index)
            before = column.shift()
            below |= tied & (column > before)
            tied &= column == before
        return bool(below.iloc[1:].all())

    return pa.Check(increases, name=f"sorted and unique by {', '.join(keys)}")


def _others_are_numbers(frame: pd.DataFrame) -> bool:
    return all(dtype == np.dtype(float) for dtype in frame.drop(columns="date").dtypes)


_DATE = pa.Column("datetime64[ms]", pa.Check(_month_end, name="dates are month ends"))
_DAY = pa.Column("datetime64[ms]", pa.Check(_whole_day, name="dates have no time of day"))
_HAS_ROWS = pa.Check(lambda frame: len(frame) > 0, name="has rows")
_RISKLESS = pa.Check(  # a study of excess returns may have no riskless rate, and then in no period
    lambda frame: frame["riskless"].isna().nunique() <= 1,
    name="a riskless return in every period or in none",
)

PANEL = pa.DataFrameSchema(
    {
        "security": _name(),
        "date": _DATE,
        "total_return": _number(pa.Check.ge(-1)),
        "excess_return": _number(),
        "size": _number(pa.Check.gt(0)),
        "price": _number(),
        "eligible": pa.Column(bool),
        "leaves": pa.Column(bool),
        # Days with a return, where the months are made from days.
        "n_days": pa.Column("int64", pa.Check.in_range(0, 31), required=False),
        # What a row weighs in a market that is built, before the weights of a period are scaled to one.
        "market_weight": pa.Column(float, pa.Check.ge(0), required=False),
    },
    checks=[_HAS_ROWS, _sorted_unique("security", "date")],
    strict=False,
)

MARKET = pa.DataFrameSchema(
    {
        "date": _DATE,
        "market_excess": _number(nullable=False),
        "riskless": _number(),
    },
    checks=[_HAS_ROWS, _sorted_unique("date"), _RISKLESS],
    strict=True,
)

FACTORS = pa.DataFrameSchema(
    {"date": _DATE},
    checks=[
        _HAS_ROWS,
        _sorted_unique("date"),
        pa.Check(_others_are_numbers, name="a number a factor"),
    ],
)

SET_ASIDE = pa.DataFrameSchema(
    {
        "file": _text(),
        "line": pa.Column("int64", pa.Check.ge(1)),
        "fault": pa.Column("int64", pa.Check.in_range(1, 40)),
        "reason": _text(),
        "raw": _text(),
    },
    strict=True,
)

BETAS = pa.DataFrameSchema(
    {
        "security": _name(),
        "date": _DATE,
        "beta": _number(nullable=False),
        "alpha": _number(nullable=False),
        "se_beta": _number(pa.Check.ge(0), nullable=False),
        "r2": _number(pa.Check.in_range(0, 1)),
        "residual_sd": _number(pa.Check.ge(0), nullable=False),
        "n_obs": pa.Column("int64", pa.Check.ge(3)),
    },
    checks=[_HAS_ROWS, _sorted_unique("security", "date")],
    strict=True,
)

MEMBERS = pa.DataFrameSchema(
    {
        "formed": _DATE,
        "asset": _name(),
        "security": _name(),
        "weight": _number(pa.Check.in_range(0, 1), nullable=False),
        "ante_beta": _number(),
        "size": _number(pa.Check.gt(0)),
    },
    checks=[_sorted_unique("formed", "asset", "security")],
    strict=True,
)

PORTFOLIO_RETURNS = pa.DataFrameSchema(
    {
        "asset": _text(),
        "date": _DATE,
        "excess_return": _number(),
        "n_members": _number(pa.Check.ge(0)),
        "mean_size": _number(pa.Check.gt(0)),
        "ante_beta": _number(),
    },
    checks=[_HAS_ROWS, _sorted_unique("asset", "date")],
    strict=True,
)

FORMATIONS = pa.DataFrameSchema(
    {
        "formed": _DATE,
        "asset": _text(),
        "n_members": _count(),
        # A sum of shares may round above 1.
        "turnover": _number(pa.Check.in_range(0, 1 + 1e-9)),
        "mean_size": _number(pa.Check.gt(0)),
        "ante_beta": _number(),
        "n_exits": _count(),
    },
    checks=[_sorted_unique("formed", "asset")],
    strict=True,
)

TRANSITIONS = pa.DataFrameSchema(
    {
        "formed": _DATE,
        "from": _text(),
        "to": _text(),
        "n": pa.Column("int64", pa.Check.ge(1)),
        "share": _number(pa.Check.in_range(0, 1), nullable=False),
    },
    checks=[_sorted_unique("formed", "from", "to")],
    strict=True,
)

ASSIGNED = pa.DataFrameSchema(
    {
        "security": _name(),
        "date": _DATE,
        "beta": _number(nullable=False),
    },
    checks=[_sorted_unique("security", "date")],
    strict=True,
)

SUBPERIOD = pa.DataFrameSchema(
    {
        "sort": _text(),
        **PORTFOLIO_RETURNS.columns,
        "market_excess": _number(nullable=False),
        "riskless": _number(),
    },
    checks=[_HAS_ROWS, _RISKLESS],
    strict=True,
)


def _defined_or_reasoned(frame: pd.DataFrame) -> bool:
    undefined = frame["status"] == "undefined"
    return bool((undefined == (frame["reason"] != "")).all())


ESTIMATES = pa.DataFrameSchema(
    {
        **{key: _text(checks=pa.Check.str_length(min_value=1)) for key in KEY_COLUMNS},
        "estimate": _number(),
        "se": _number(pa.Check.ge(0)),
        "statistic": _number(),
        "df1": _number(pa.Check.gt(0)),
        "df2": _number(pa.Check.gt(0)),
        "p": _number(pa.Check.in_range(0, 1)),
        "p_one_sided": _number(pa.Check.in_range(0, 1)),
        "critical": _number(),
        "critical_one_sided": _number(),
        "n_periods": _count(),
        "n_assets": _count(),
        "status": _text(checks=pa.Check.isin(["ok", "undefined"])),
        "reason": _text(),
    },
    checks=[
        _HAS_ROWS,
        pa.Check(lambda frame: ~frame.duplicated(KEY_COLUMNS), name="one row an address"),
        pa.Check(_defined_or_reasoned, name="a reason exactly where a number is undefined"),
    ],
    strict=True,
    ordered=True,
)

# By name, as of a monthly study; `daily` and `market_daily` are the days beside a study of months.
CONTRACTS: dict[str, pa.DataFrameSchema] = {
    "panel": PANEL,
    "market": MARKET,
    "daily": PANEL,
    "market_daily": MARKET,
    "factors": FACTORS,
    "set_aside": SET_ASIDE,
    "betas": BETAS,
    "members": MEMBERS,
    "portfolio_returns": PORTFOLIO_RETURNS,
    "formations": FORMATIONS,
    "transitions": TRANSITIONS,
    "assigned": ASSIGNED,
    "subperiod": SUBPERIOD,
    "estimates": ESTIMATES,
}
_ALWAYS_DAILY = ("daily", "market_daily")


@cache
def contract(name: str, frequency: str = "monthly") -> pa.DataFrameSchema:
    """The contract of a table by name, for the dates of a monthly or a daily one.

    Raises KeyError for an unknown name.
    """
    schema = CONTRACTS[name]
    dated = [key for key, column in schema.columns.items() if str(column.dtype) == str(_DATE.dtype)]
    if (frequency == "monthly" and name not in _ALWAYS_DAILY) or not dated:
        return schema
    return schema.update_columns({key: {"checks": _DAY.checks} for key in dated})


def check_batch(
    name: str, frequency: str, batch: pd.DataFrame, before: pd.DataFrame | None
) -> None:
    """Check a piece of a table larger than memory against its contract, and that it goes on from the row before it."""
    whole = contract(name, frequency)
    whole.validate(batch)
    if before is not None and len(batch):
        whole.validate(pd.concat([before, batch.iloc[:1]], ignore_index=True))
