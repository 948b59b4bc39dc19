"""The stage that takes raw files in: a clean panel, the market, everything set aside, and the counts."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
import pandas as pd

from lineproof.intake.chunk import Chunk
from lineproof.intake.delisting import leaving_rows, with_final_returns
from lineproof.intake.factor import Factor, Series, join
from lineproof.intake.faults import FAULTS
from lineproof.intake.first_pass import Taken, take_rows
from lineproof.intake.flags import flag_rows
from lineproof.intake.panel import panel_frame
from lineproof.intake.reading import open_files
from lineproof.intake.screens import Screens
from lineproof.intake.second_pass import Rules, Tracked, chunks
from lineproof.intake.series import check_riskless, read_series, riskless_return
from lineproof.intake.stopping import counted, stop
from lineproof.intake.values import check_date_format, missing_codes
from lineproof.periods import Months
from lineproof.problems import KnownProblem, Problem
from lineproof.store import Scratch

_OURS = {"line", "code", "return_", "total_return", "excess_return", "eligible", "leaves"}
_NOTHING_LEFT = "Nothing is left to study."


def validate_returns(
    files: Mapping[str, list[str]],
    scratch: Scratch,
    *,
    returns: dict[str, Any],
    market: dict[str, Any],
    market_is: str,
    riskless: dict[str, Any],
    riskless_quoted: str,
    rules: dict[str, Any],
) -> Intake:
    """Read the raw files, by name in `files`: returns, market, riskless. Every row of the returns is read once.

    `scratch` holds what memory does not. Raises KnownProblem when a file cannot be used at all.
    """
    _check_names(returns)
    check_date_format(returns)
    rate = read_series(files["riskless"][0], riskless, "rate")
    rate["riskless"] = riskless_return(rate["rate"], riskless_quoted)
    check_riskless(rate, riskless, riskless_quoted)
    index = read_series(files["market"][0], market, "return")
    opened = open_files(files["returns"], returns)
    taken = take_rows(opened, returns, scratch, lambda day, decimal: None)
    periods = Months()
    number = periods.number
    factor = join(
        Series(market["label"], number(_days(index)), index["return"].to_numpy()),
        Series(riskless["label"], number(_days(rate)), rate["riskless"].to_numpy()),
        market_is,
        periods,
        tuple(number(taken.days[0][[0, -1]])) if taken.n_dated else (0, 0),
    )
    return Intake(opened, returns, taken, factor, rules)


def _days(series: pd.DataFrame) -> np.ndarray:
    return series["date"].to_numpy().astype("datetime64[D]")


def _check_names(reading: dict[str, Any]) -> None:
    taken = sorted(_OURS & set(reading["columns"]))
    if taken:
        found = f"our own tables have a column {taken[0]!r} already"
        raise stop(f"{reading['label']}, columns.{taken[0]}", found, "give it another name")


class Intake:
    """Raw rows on their way into the study: ask for the tables first, then for what was counted on the way."""

    def __init__(
        self,
        files: list,
        reading: dict[str, Any],
        taken: Taken,
        factor: Factor,
        rules: dict[str, Any],
    ) -> None:
        self._files, self._reading, self._taken, self._factor = files, reading, taken, factor
        self._rules = rules
        self._tracked = Tracked(np.zeros(len(files), np.int64), np.zeros(len(files), np.int64))
        self._screens = Screens(rules["screens"], rules["stale_run"], factor.span.periods.noun)
        self._first, self._last = np.iinfo(np.int64).max, np.iinfo(np.int64).min
        self._n_rows = self._n_securities = self._n_missing = self._n_screened = 0
        self._any_leaves = False

    def tables(self) -> Iterator[dict[str, pd.DataFrame]]:
        """Pieces of the panel, some securities at a time.

        Raises KnownProblem when the raw data as a whole are not what the study file says of them, or nothing is left.
        """
        rules = self._rules
        how = Rules(
            same_month_rows=rules["same_month_rows"],
            return_after_hole=rules["return_after_hole"],
            jumps=rules["jump_and_reversal"],
            from_price="return" not in self._reading["columns"],
        )
        for chunk in chunks(self._taken, self._factor.span, how, self._tracked):
            yield {"panel": self._piece(chunk)}
        self._check_conservation()
        if self._n_rows == 0:
            raise self._nothing_kept()
        self._taken.aside.count(self._files, self._taken.tally)
        self._taken.tally.add(26, 0 if self._any_leaves else 1)

    def _piece(self, chunk: Chunk) -> pd.DataFrame:
        """The panel's rows of one chunk; counts what the report shows."""
        taken, rules, span = self._taken, self._rules, self._factor.span
        flag_rows(chunk, taken.tally, missing_codes(self._reading["missing"]), span.periods)
        leaves = leaving_rows(chunk, taken.last_seen(chunk.names), self._last_day())
        chunk.values["total_return"] = with_final_returns(
            chunk,
            leaves,
            rules["missing_final_return"],
            rules["final_return_by_reason"],
            taken.tally,
        )
        excess = chunk.values["total_return"] - self._factor.riskless[chunk.period - span.first]
        eligible = self._screens.eligible(chunk)
        self._count(chunk, eligible, leaves)
        return panel_frame(chunk, span.periods, excess, eligible, leaves)

    def _last_day(self) -> np.datetime64:
        """The first day of the last period in which anything was delivered within the span of the study."""
        periods, span = self._factor.span.periods, self._factor.span
        numbers = periods.number(self._taken.days[0])
        within = numbers[(numbers >= span.first) & (numbers <= span.last)]
        return periods.begins(int(within.max())) if len(within) else np.datetime64("NaT")

    def _count(self, chunk: Chunk, eligible: np.ndarray, leaves: np.ndarray) -> None:
        self._first = min(self._first, int(chunk.period.min()))
        self._last = max(self._last, int(chunk.period.max()))
        self._n_rows += len(chunk)
        self._n_securities += len(chunk.names)
        self._n_missing += int(np.isnan(chunk.values["total_return"]).sum())
        self._n_screened += int((~eligible).sum())
        self._any_leaves |= bool(leaves.any())

    def market(self) -> pd.DataFrame:
        """Date, market_excess and riskless of every period of the panel."""
        return self._factor.table(None, self._first, self._last)

    def set_aside(self) -> Iterator[dict[str, pd.DataFrame]]:
        """Pieces of the table of rows set aside, by file and line."""
        for table in self._taken.aside.tables(self._files):
            yield {"set_aside": table}

    def counts(self) -> dict[str, Any]:
        """What came in and what became of it: see `intake.record`."""
        taken, tracked = self._taken, self._tracked
        aside = taken.aside.counts(len(self._files))
        name = self._factor.span.periods.name
        return {
            "file": self._reading["label"],
            "first": name(self._first),
            "last": name(self._last),
            "rows_read": sum(taken.n_read),
            "rows_kept": int(tracked.n_kept.sum()),
            "rows_set_aside": sum(aside),
            "exact_duplicates": int(tracked.n_duplicates.sum()),
            "rows_screened": self._n_screened,
            "n_securities": self._n_securities,
            "n_missing_returns": self._n_missing,
            "faults": taken.tally.report(),
            "screens": self._screens.report(),
            "span": self._span(),
        }

    def _check_conservation(self) -> None:
        aside = self._taken.aside.counts(len(self._files))
        for at, n_read in enumerate(self._taken.n_read):
            kept, exact = int(self._tracked.n_kept[at]), int(self._tracked.n_duplicates[at])
            if n_read != kept + aside[at] + exact:
                raise AssertionError(
                    f"rows of {self._files[at].label} were lost: {n_read} read, {kept} kept, {aside[at]} set aside, "
                    f"{exact} exact duplicates"
                )

    def _nothing_kept(self) -> KnownProblem:
        """The error when every row is set aside: each fault with its first row."""
        problems = []
        for number, n, place, reason in self._taken.aside.first_of_each(self._files):
            found = f"{counted(n, 'row')} with {FAULTS[number].label}"
            problems.append(Problem(self._reading["label"], found, f"{place} has {reason}"))
        return KnownProblem(f"{_NOTHING_LEFT} Every row is set aside.", problems)

    def _span(self) -> list[str]:
        """What is to be said when the returns reach beyond the market or the riskless rate."""
        span, factor, said = self._factor.span, self._factor, []
        if n := self._tracked.n_before:
            said.append(
                f"{counted(n, 'row')} of returns dated before {span.periods.name(span.first)}, where {factor.begins} "
                "begins: the study begins there"
            )
        if n := self._tracked.n_after:
            said.append(
                f"{counted(n, 'row')} of returns dated after {span.periods.name(span.last)}, where {factor.ends} ends: "
                "the study ends there"
            )
        return said
