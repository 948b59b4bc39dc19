"""Raw rows on their way into the study: the panel comes out in pieces, and what was counted on the way after it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.frequency import FREQUENCIES
from lineproof.intake.account import Account, PanelCounts
from lineproof.intake.blocks import RawFile
from lineproof.intake.chunk import Chunk
from lineproof.intake.compounding import Compounded, compound_to_months
from lineproof.intake.delisting import Leavers, leaving_rows
from lineproof.intake.excess_or_total import looks_like_excess
from lineproof.intake.factor import total_and_excess
from lineproof.intake.faults import Flag
from lineproof.intake.first_pass import Taken
from lineproof.intake.flags import flag_rows
from lineproof.intake.market_build import MarketBuild
from lineproof.intake.observers import evidence, start_observers
from lineproof.intake.panel import panel_frame
from lineproof.intake.rates import Rates, Supplied
from lineproof.intake.scale import ScaleEvidence
from lineproof.intake.screens import Screens
from lineproof.intake.second_pass import Rules, chunks
from lineproof.intake.series_record import UsedDays
from lineproof.intake.stopping import counted
from lineproof.intake.thin import judge_thin_periods
from lineproof.intake.trading_days import whole_months
from lineproof.intake.unit import scale_findings
from lineproof.intake.unit_by_security import UnitBySecurity
from lineproof.intake.values import missing_codes
from lineproof.periods import Months


@dataclass(frozen=True)
class Kinds:
    """What kind of returns a study has: `frequency` of the study and `delivered` of the raw returns, "monthly" or
    "daily"; `returns_are` "total" or "excess"; `build` the weights of a market made from the panel, or None."""

    frequency: str
    delivered: str
    returns_are: str
    build: str | None

    @property
    def compounds(self) -> bool:
        """Whether days are delivered and months studied."""
        return self.frequency != self.delivered


class Intake:
    """Ask for `tables` to the end, then for `markets` and `set_aside`, and for `counts` last."""

    def __init__(
        self,
        files: list[RawFile],
        reading: dict[str, Any],
        taken: Taken,
        supplied: Supplied,
        kinds: Kinds,
        rules: dict[str, Any],
        scale: ScaleEvidence,
        stretches: Flag,
    ) -> None:
        self._reading, self._taken, self._kinds = reading, taken, kinds
        self._rules, self._scale, self._stretches = rules, scale, stretches
        self._account = Account(files, reading["label"], taken)
        if not taken.n_dated:
            raise self._account.nothing_kept()
        days, counts = taken.days
        self._delivered = supplied.delivered(kinds.delivered, days, counts)
        self._rates = supplied.monthly(days) if kinds.compounds else self._delivered
        self._supplied = supplied
        self._whole = whole_months(days, counts) if kinds.compounds else None
        periods = self._delivered.span.periods
        self._leaving_before = self._first_day_of_staying(days)
        self._screens = Screens(rules["screens"], rules["stale_run"], self._rates.span.periods.noun)
        self._observers = start_observers(periods)
        self._units = UnitBySecurity()
        span = self._delivered.span
        n_periods = span.last - span.first + 1
        self._leavers = Leavers(
            rules["missing_final_return"], rules["final_return_by_reason"], span.first, n_periods
        )
        self._builds = (
            {name: MarketBuild(kinds.build) for name in self.panels} if kinds.build else {}
        )
        self._alive = np.zeros(n_periods, np.int64)
        self._panel = PanelCounts()

    @property
    def _are_made_total(self) -> bool:
        """Whether returns come in excess of a riskless rate that is known; without it they stay so."""
        has_rate = not np.isnan(self._delivered.riskless).all()
        return self._kinds.returns_are == "excess" and has_rate

    @property
    def _are(self) -> str:
        """What the returns are once they are in the panel's chunks."""
        return "total" if self._are_made_total else self._kinds.returns_are

    @property
    def panels(self) -> list[str]:
        """Names of the tables that `tables` gives pieces of."""
        return ["panel", "daily"] if self._kinds.compounds else ["panel"]

    def tables(self) -> Iterator[dict[str, pd.DataFrame]]:
        """Pieces of the panel and, where days are delivered to a monthly study, of the daily panel.

        Raises KnownProblem when the raw data as a whole are not what the study file says, or nothing is left.
        """
        rules = Rules(
            same_month_rows=self._rules["same_month_rows"],
            return_after_hole=self._rules["return_after_hole"],
            jumps=self._rules["outliers"]["jump_and_reversal"],
            from_price=self._reading.get("return_from") == "price",
            added=self._delivered.riskless if self._are_made_total else None,
        )
        for chunk in chunks(self._taken, self._delivered.span, rules, self._account.tracked):
            yield self._pieces(chunk)
        self._account.check_conservation()
        if self._panel.n_rows == 0:
            raise self._account.nothing_kept()
        self._judge()

    def _pieces(self, chunk: Chunk) -> dict[str, pd.DataFrame]:
        taken, rates = self._taken, self._delivered
        periods = rates.span.periods
        flag_rows(chunk, taken.tally, missing_codes(self._reading["missing"]), periods)
        self._units.see(chunk)
        leaves = leaving_rows(chunk, taken.last_seen(chunk.names), self._leaving_before)
        chunk.values["total_return"] = self._leavers.with_final_returns(chunk, leaves, taken.tally)
        self._alive += np.bincount(chunk.period - rates.span.first, minlength=len(self._alive))
        for observer in self._observers.values():
            observer.see(chunk)
        if not self._kinds.compounds:
            return {"panel": self._piece(chunk, leaves, rates, "panel")}
        months = compound_to_months(chunk)
        pieces = {"daily": self._piece(chunk, leaves, rates, "daily")}
        whole = self._within(months)
        if len(whole.months):
            n_days = whole.n_days
            pieces["panel"] = self._piece(
                whole.months, leaves[whole.last], self._rates, "panel", n_days
            )
        return pieces

    def _within(self, months: Compounded) -> Compounded:
        """The months that the study has: whole ones with a market and a riskless rate."""
        span, whole = self._rates.span, self._whole
        assert whole is not None
        period = months.months.period
        mask = (period >= max(span.first, whole[0])) & (period <= min(span.last, whole[1]))
        return Compounded(months.months.only(mask), months.last[mask], months.n_days[mask])

    def _piece(
        self,
        chunk: Chunk,
        leaves: np.ndarray,
        rates: Rates,
        name: str,
        n_days: np.ndarray | None = None,
    ) -> pd.DataFrame:
        """Rows of the panel, or of the daily panel beside it, which nobody is ranked in."""
        known = chunk.values["total_return"]
        riskless = rates.riskless_of(chunk.period)
        total, excess = total_and_excess(known, riskless, self._are)
        if "excess" in chunk.values and rates is self._delivered:
            as_given = known == chunk.values["return_"]  # no rounding of there and back
            excess = np.where(as_given, chunk.values["excess"], excess)
        weight = self._builds[name].see(chunk, known) if self._builds else None
        eligible = np.ones(len(chunk), bool)
        if name == "panel":
            eligible = self._screens.eligible(chunk)
            self._panel.add(chunk, eligible)
        chunk.values["total_return"] = total
        more = {"n_days": n_days, "market_weight": weight}
        given = {column: values for column, values in more.items() if values is not None}
        return panel_frame(chunk, rates.span.periods, excess, eligible, leaves, given)

    def _first_day_of_staying(self, days: np.ndarray) -> np.datetime64:
        """A security whose last row is dated before this day has left: the first day of the last period with rows.

        Among days it is the first of the last ten, since not every security trades every day.
        """
        span = self._delivered.span
        numbers = span.periods.number(days)
        within = numbers[(numbers >= span.first) & (numbers <= span.last)]
        last = int(within.max()) if len(within) else span.last
        back = 9 if self._kinds.delivered == "daily" else 0
        return span.periods.begins(max(last - back, span.first))

    def _judge(self) -> None:
        """What can be said of the whole only. Raises KnownProblem."""
        label, tally, rules = self._reading["label"], self._taken.tally, self._rules
        self._other_securities = self._units.judge(label, rules["other_unit_stop_above"])
        flags = [self._stretches, self._other_securities, self._thin(), self._other_kind()]
        self._account.tally()
        for flag in flags:
            tally.add(*flag)
        tally.add(26, 0 if self._leavers.n else 1)

    def _thin(self) -> Flag:
        """Periods delivered in part, among those that have rows at all."""
        held = np.flatnonzero(self._alive)
        span = self._delivered.span
        return judge_thin_periods(
            self._alive[held[0] : held[-1] + 1],
            span.first + int(held[0]),
            span.periods,
            self._reading["label"],
            allow_last=self._rules["allow_partial_last_month"],
        )

    def _other_kind(self) -> Flag:
        """Whether the market looks like the other of total and excess."""
        rates = self._delivered
        if rates.market_excess is None or np.isnan(rates.riskless).all():
            return Flag(30, 0, [], {})
        own = self._leavers.means
        as_given = rates.market_excess + (
            rates.riskless if self._supplied.market_is == "total" else 0.0
        )
        said = looks_like_excess(as_given, rates.riskless, own, self._supplied.market_is)
        return Flag(30, 1 if said else 0, [said] if said else [], {})

    def markets(self) -> dict[str, pd.DataFrame]:
        """The market and the riskless return of each period of the panel: `market`, and `market_daily` beside it."""
        panel = self._panel
        found = {"market": self._market(self._rates, "panel", panel.first, panel.last)}
        if self._kinds.compounds and (self._delivered.market_excess is not None or self._builds):
            held = np.flatnonzero(self._alive) + self._delivered.span.first
            daily = self._market(self._delivered, "daily", int(held[0]), int(held[-1]))
            found["market_daily"] = daily
        self._used = UsedDays(found, self._kinds.frequency)
        noun = FREQUENCIES[self._kinds.frequency].noun
        self._series = self._supplied.records(found["market"], noun, self._kinds.build)
        return found

    def _market(self, rates: Rates, name: str, first: int, last: int) -> pd.DataFrame:
        if not self._builds:
            return rates.table(first, last, None)
        built = self._builds[name].result(rates.span.periods)
        number = rates.span.periods.number(built["date"].to_numpy().astype("datetime64[D]"))
        riskless = rates.riskless_of(number)
        _, excess = total_and_excess(built["return"].to_numpy(), riskless, self._are)
        return rates.table(first, last, built[["date"]].assign(market_excess=excess))

    def set_aside(self) -> Iterator[dict[str, pd.DataFrame]]:
        """Pieces of the table of rows set aside, by file and line."""
        for table in self._account.set_aside():
            yield {"set_aside": table}

    def files(self) -> list[dict[str, Any]]:
        """A `record.FileRecord` a raw file, those of returns first."""
        return [*self._account.file_records(), *self._supplied.files(self._used)]

    def counts(self) -> dict[str, Any]:
        """What came in and what became of it: see `intake.record`."""
        panel, name = self._panel, self._rates.span.periods.name
        return {
            **self._account.totals(),
            "first": name(panel.first),
            "last": name(panel.last),
            "period": "day" if self._kinds.delivered == "daily" else "month",
            "rows_screened": panel.n_screened,
            "n_securities": panel.n_securities,
            "n_missing_returns": panel.n_missing,
            "files": self.files(),
            "series": self._series,
            "faults": self._taken.tally.report(self._answers()),
            "screens": self._screens.report(),
            "span": self._span(),
            "set_aside": self._account.aside_records(),
            "delisting": self._leavers.record(),
            "evidence": {**evidence(self._observers), "scale": self._scale_records()},
        }

    def _answers(self) -> dict[int, str]:
        """The answers that the study file chose in place of the usual ones."""
        chosen = {}
        if self._rules["return_after_hole"] == "set_aside":
            chosen[20] = "set aside"
        if self._rules["outliers"]["jump_and_reversal"] == "set_aside":
            chosen[22] = "set aside"
        return chosen

    def _scale_records(self) -> list[dict[str, Any]]:
        others = self._other_securities
        units = self._units.result()
        by_security = {
            "what": "the same unit for every security",
            "found": "; ".join(others.examples)
            or f"none of {counted(units['n_judged'], 'security')} stands out",
            "verdict": "to be looked at" if others.n else "one unit throughout",
        }
        return [*scale_findings(self._scale, self._reading, self._stretches), by_security]

    def _span(self) -> list[str]:
        """What is to be said when the returns reach beyond the market or the riskless rate."""
        rates, tracked, said = self._delivered, self._account.tracked, []
        name = rates.span.periods.name
        if n := tracked.n_before:
            said.append(
                f"{counted(n, 'row')} of returns dated before {name(rates.span.first)}, where {rates.begins} "
                "begins: the study begins there"
            )
        if n := tracked.n_after:
            said.append(
                f"{counted(n, 'row')} of returns dated after {name(rates.span.last)}, where {rates.ends} ends: "
                "the study ends there"
            )
        return said + self._partial_months()

    def _partial_months(self) -> list[str]:
        """What is to be said of a first or last month that days were delivered of, but not enough."""
        if self._whole is None:
            return []
        days = self._taken.days[0]
        held = Months().number(days[[0, -1]]).tolist()
        return [
            f"{Months().name(at)} is delivered in part: its days are kept, but make no month"
            for at, is_part in zip(
                held, (held[0] < self._whole[0], held[1] > self._whole[1]), strict=True
            )
            if is_part
        ]
