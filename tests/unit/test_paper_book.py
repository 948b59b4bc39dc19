"""Looking numbers up by their addresses."""

from __future__ import annotations

import pandas as pd
import pytest
from tests.unit.paper_examples import usual

from lineproof import pricing
from lineproof.addresses import NUMBER_COLUMNS
from lineproof.analyses import LINE_ERRORS
from lineproof.paper.book import KEY_COLUMNS, Book

ALPHA = "ten/full/time_series/market/p01/alpha/hac"


@pytest.fixture(scope="module")
def book() -> Book:
    return usual().book


def test_addresses_are_those_of_the_estimates(book: Book) -> None:
    estimates = usual().estimates
    assert list(KEY_COLUMNS) == list(pricing.KEY_COLUMNS)
    addresses = estimates[list(KEY_COLUMNS)].agg("/".join, axis=1)
    short = (estimates["n_periods"] < estimates["n_assets"] + 2) & (
        estimates["analysis"] == "market_line"
    )  # see below
    kept = estimates["estimate"].where(~short | estimates["se_kind"].eq("-"))
    for address, estimate in zip(addresses, kept, strict=True):
        found = book.at(address).estimate
        assert found == estimate or (pd.isna(found) and pd.isna(estimate))


def test_whole_address_and_parts_give_the_same_number(book: Book) -> None:
    assert book.at(ALPHA) == book.at(*ALPHA.split("/"))


def test_unknown_address_names_the_nearest(book: Book) -> None:
    with pytest.raises(KeyError, match="ten/full/time_series/market/p01/alpha/hac"):
        book.at("ten/full/time_series/market/p01/alpha/hacc")


def test_two_rows_of_one_address_are_refused() -> None:
    rows = usual().estimates.iloc[[0, 0]]
    with pytest.raises(ValueError, match="share one address"):
        Book(rows)


def test_assets_keep_their_order_and_leave_the_market_out(book: Book) -> None:
    assert book.assets("ten", "full") == [f"p{place:02d}" for place in range(1, 11)]
    assert book.assets("ten", "no such subperiod") == []


@pytest.mark.parametrize("kind", list(LINE_ERRORS))
def test_a_line_of_too_few_months_is_kept_in_the_estimates_and_not_printed(
    book: Book, kind: str
) -> None:
    """Six months for seven sector indices."""
    address = f"sectors/short/market_line/ols/all/slope/{kind}"
    rows = usual().estimates
    found = rows[rows[list(KEY_COLUMNS)].agg("/".join, axis=1) == address]
    assert found["status"].tolist() == ["ok"]
    number = book.at(address)
    assert not number.defined
    assert number.reason == "needs at least 9 periods for 7 assets, has 6"
    assert not number.rejects(0.99)
    assert all(pd.isna(getattr(number, name)) for name in NUMBER_COLUMNS)
    assert book.at("sectors/short/market_line/-/all/market_mean/-").defined
    assert book.at(f"ten/full/market_line/ols/all/slope/{kind}").defined
