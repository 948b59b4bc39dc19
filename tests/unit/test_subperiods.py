"""Subperiods by hand, and that the parts of a cut cover every month once."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
from pandera.errors import SchemaError

from lineproof.frames import SUBPERIOD
from lineproof.problems import KnownProblem
from lineproof.subperiods import Subperiod, cut_subperiods, resolve_subperiods

FIRST, LAST = "1955-01", "1964-08"  # 116 months


def entry(
    first: str = "first",
    last: str = "last",
    *,
    split: int | None = None,
    every: int | None = None,
    title: str | None = None,
) -> dict[str, Any]:
    return {"first": first, "last": last, "split": split, "every": every, "title": title}


def resolve(**specs: dict[str, Any]) -> list[Subperiod]:
    return resolve_subperiods(specs, FIRST, LAST)


def dates(found: list[Subperiod]) -> list[tuple[str, str, str]]:
    return [(s.name, s.first, s.last) for s in found]


def months(subperiod: Subperiod) -> list[str]:
    return [str(m) for m in pd.period_range(subperiod.first, subperiod.last, freq="M")]


def test_the_whole_and_a_stretch_in_the_study_s_order() -> None:
    found = resolve(late=entry("1960-03", "1962-02"), full=entry())
    assert dates(found) == [("late", "1960-03", "1962-02"), ("full", FIRST, LAST)]
    assert [s.n_months for s in found] == [24, 116]


def test_stretches_are_clipped_to_the_data() -> None:
    found = resolve(early=entry("1900-01", "1955-06"), late=entry("1964-08", "2020-12"))
    assert dates(found) == [("early", "1955-01", "1955-06"), ("late", "1964-08", "1964-08")]
    assert [s.n_months for s in found] == [6, 1]


def test_the_first_parts_of_a_split_get_the_months_left_over() -> None:
    """116 months in five: 24, 23, 23, 23, 23."""
    assert dates(resolve(fifths=entry(split=5))) == [
        ("fifths-1", "1955-01", "1956-12"),
        ("fifths-2", "1957-01", "1958-11"),
        ("fifths-3", "1958-12", "1960-10"),
        ("fifths-4", "1960-11", "1962-09"),
        ("fifths-5", "1962-10", "1964-08"),
    ]


def test_every_so_many_years_with_a_short_last_part() -> None:
    assert dates(resolve(four=entry(every=4))) == [
        ("four-1955", "1955-01", "1958-12"),
        ("four-1959", "1959-01", "1962-12"),
        ("four-1963", "1963-01", "1964-08"),
    ]
    longer = resolve(whole=entry(every=50))
    assert dates(longer) == [("whole-1955", FIRST, LAST)]


def test_every_counts_from_the_first_month_of_the_stretch() -> None:
    found = resolve(two=entry("1960-07", "1963-12", every=2))
    assert dates(found) == [("two-1960", "1960-07", "1962-06"), ("two-1962", "1962-07", "1963-12")]


@pytest.mark.parametrize(
    ("spec", "title"),
    [
        (entry("1956-01", "1959-12"), "1956–1959"),
        (entry("1956-01", "1956-12"), "1956"),
        (entry("1956-02", "1956-12"), "Feb 1956 – Dec 1956"),
        (entry("1956-01", "1959-12", title="The quiet years"), "The quiet years, 1956–1959"),
    ],
)
def test_titles(spec: dict[str, Any], title: str) -> None:
    assert [s.title for s in resolve(some=spec)] == [title]


@pytest.mark.parametrize("n", [2, 3, 7, 50, 116])
def test_parts_of_a_split_cover_each_month_once(n: int) -> None:
    parts = resolve(parts=entry(split=n))
    covered = [month for part in parts for month in months(part)]
    assert covered == [str(m) for m in pd.period_range(FIRST, LAST, freq="M")]
    lengths = [part.n_months for part in parts]
    assert len(parts) == n
    assert max(lengths) - min(lengths) <= 1
    assert lengths == sorted(lengths, reverse=True)


@pytest.mark.parametrize("every", [1, 2, 3, 10])
def test_parts_of_every_cover_each_month_once(every: int) -> None:
    parts = resolve(parts=entry("1956-05", "1963-10", every=every))
    covered = [month for part in parts for month in months(part)]
    assert covered == [str(m) for m in pd.period_range("1956-05", "1963-10", freq="M")]
    assert {part.n_months for part in parts[:-1]} <= {12 * every}


def test_subperiods_may_overlap() -> None:
    found = resolve(a=entry("1956-01", "1960-12"), b=entry("1958-01", "1962-12"))
    assert [s.n_months for s in found] == [60, 60]


@pytest.mark.fault(33)
def test_every_misfit_is_told_at_once() -> None:
    with pytest.raises(KnownProblem) as told:
        resolve(
            before=entry("1940-01", "1954-12"),
            after=entry("1964-09", "last"),
            short=entry("1955-01", "1955-03", split=4),
            good=entry(),
        )
    message = str(told.value)
    assert "subperiods.before: 1940-01 to 1954-12 lies outside" in message
    assert "subperiods.after: 1964-09 to last lies outside" in message
    assert "subperiods.short: 1955-01 to 1955-03 is too short to split into 4" in message
    assert len(told.value.problems) == 3


@pytest.mark.fault(33)
def test_two_parts_of_one_name() -> None:
    with pytest.raises(KnownProblem, match=r"subperiods\.half-1: two subperiods get this name"):
        resolve(half=entry(split=2), **{"half-1": entry("1955-01", "1957-12")})


def returns_of(first: str, n: int, *, missing: tuple[int, ...] = ()) -> pd.DataFrame:
    date = pd.date_range(first, periods=n, freq="ME", unit="ms")
    frame = pd.DataFrame({"asset": "p01", "date": date, "excess_return": np.arange(n) / 1000})
    frame.loc[list(missing), "excess_return"] = np.nan
    return frame.assign(n_members=5.0, mean_size=2.0, ante_beta=1.0)


def market_of(first: str, n: int) -> pd.DataFrame:
    date = pd.date_range(first, periods=n, freq="ME", unit="ms")
    return pd.DataFrame({"date": date, "market_excess": 0.01, "riskless": np.arange(n) / 1e5})


def test_cuts_follow_the_main_test_assets_and_keep_the_others_months() -> None:
    sorts = {"main": returns_of("2000-01-31", 24), "other": returns_of("2000-07-31", 40)}
    specs = {"full": entry(), "late": entry("2001-07")}
    subperiods, cuts = cut_subperiods(sorts, market_of("1999-01-31", 100), main="main", specs=specs)
    assert dates(subperiods) == [("full", "2000-01", "2001-12"), ("late", "2001-07", "2001-12")]
    assert list(cuts) == ["full", "late"]
    for cut in cuts.values():
        SUBPERIOD.validate(cut)
    assert cuts["full"]["sort"].value_counts().to_dict() == {"main": 24, "other": 18}
    assert cuts["late"]["sort"].value_counts().to_dict() == {"main": 6, "other": 6}
    main = cuts["late"][cuts["late"]["sort"] == "main"]
    assert main["excess_return"].tolist() == [k / 1000 for k in range(18, 24)]
    assert main["riskless"].tolist() == [k / 1e5 for k in range(30, 36)]  # the same months


def test_months_without_any_return_at_the_ends_do_not_count() -> None:
    main = returns_of("2000-01-31", 24, missing=(0, 1, 23))
    subperiods, _ = cut_subperiods(
        {"main": main}, market_of("2000-01-31", 24), main="main", specs={"full": entry()}
    )
    assert dates(subperiods) == [("full", "2000-03", "2001-11")]


def test_the_parts_of_a_split_conserve_every_row() -> None:
    main = returns_of("2000-01-31", 31)
    _, cuts = cut_subperiods(
        {"main": main}, market_of("2000-01-31", 31), main="main", specs={"cut": entry(split=4)}
    )
    again = pd.concat(cuts.values(), ignore_index=True)
    pd.testing.assert_frame_equal(again[list(main)], main, check_exact=True)


def test_the_contract_refuses_a_month_without_a_market() -> None:
    """Intake sets such returns aside; one that came through would be an error of ours."""
    _, cuts = cut_subperiods(
        {"main": returns_of("2000-01-31", 12)},
        market_of("2000-01-31", 6),
        main="main",
        specs={"full": entry()},
    )
    with pytest.raises(SchemaError, match="market_excess"):
        SUBPERIOD.validate(cuts["full"])


def test_a_subperiod_in_a_hole_of_all_test_assets() -> None:
    main = returns_of("2000-01-31", 36).drop(index=range(10, 20))
    with pytest.raises(KnownProblem, match=r"subperiods\.gap: no test asset has a return in it"):
        cut_subperiods(
            {"main": main},
            market_of("2000-01-31", 36),
            main="main",
            specs={"full": entry(), "gap": entry("2000-12", "2001-03")},
        )
