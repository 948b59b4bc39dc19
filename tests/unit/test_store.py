"""Files are written whole or not at all, and a table that breaks its contract is not written."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pandera.errors
import pytest

from lineproof import store


def market(dates: list[str]) -> pd.DataFrame:
    return pd.DataFrame(
        {
            "date": pd.to_datetime(dates).as_unit("ms"),
            "market_excess": [0.01] * len(dates),
            "riskless": [0.002] * len(dates),
        }
    )


def test_a_table_comes_back_as_it_was(tmp_path: Path) -> None:
    frame = market(["2000-01-31", "2000-02-29"])
    store.write_table(frame, tmp_path / "deep" / "market.parquet", "market")
    pd.testing.assert_frame_equal(store.read_table(tmp_path / "deep" / "market.parquet"), frame)


@pytest.mark.parametrize(
    "dates",
    [
        ["2000-02-29", "2000-01-31"],
        ["2000-01-31", "2000-01-31"],
        ["2000-01-30", "2000-02-29"],
        [],
    ],
    ids=["not sorted", "twice", "not a month end", "no rows"],
)
def test_a_table_that_breaks_its_contract_is_not_written(tmp_path: Path, dates: list[str]) -> None:
    with pytest.raises(pandera.errors.SchemaError):
        store.write_table(market(dates), tmp_path / "market.parquet", "market")
    assert list(tmp_path.iterdir()) == []


def test_the_riskless_rate_is_known_in_every_period_or_in_none(tmp_path: Path) -> None:
    frame = market(["2000-01-31", "2000-02-29"])
    store.write_table(frame.assign(riskless=float("nan")), tmp_path / "none.parquet", "market")
    partly = frame.assign(riskless=[0.002, float("nan")])
    with pytest.raises(pandera.errors.SchemaError, match="in every period or in none"):
        store.write_table(partly, tmp_path / "partly.parquet", "market")


@pytest.mark.fault(35)
def test_a_failed_write_leaves_the_old_file_and_nothing_else(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "file.txt"
    store.write_text("old", path)

    def full(self: Path, content: bytes) -> None:
        with self.open("wb") as handle:
            handle.write(content[:1])
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(OSError, match="No space"):
        store.write_text("new", path)
    assert path.read_text() == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["file.txt"]


def test_an_unchanged_text_keeps_its_time(tmp_path: Path) -> None:
    path = tmp_path / "options.json"
    store.write_if_changed("{}\n", path)
    before = path.stat().st_mtime_ns
    store.write_if_changed("{}\n", path)
    assert path.stat().st_mtime_ns == before
    store.write_if_changed("[]\n", path)
    assert path.read_text() == "[]\n"


def test_only_named_tables_stay(tmp_path: Path) -> None:
    for name in ("a.parquet", "b.parquet", "index.json"):
        (tmp_path / name).touch()
    store.keep_only({"a"}, tmp_path)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.parquet", "index.json"]


def betas(dates: list[str], security: pd.Series) -> pd.DataFrame:
    numbers = {"beta": 1.0, "alpha": 0.0, "se_beta": 0.1, "r2": 0.5, "residual_sd": 0.1, "n_obs": 5}
    date = pd.to_datetime(dates).as_unit("ms")
    return pd.DataFrame({"security": security, "date": date}).assign(**numbers)


def test_categories_and_text_give_the_same_bytes(tmp_path: Path) -> None:
    months = ["2000-01-31", "2000-02-29", "2000-02-29"]
    text = pd.Series(["A", "A", "B"])
    names = pd.CategoricalDtype(pd.Index(["unused", "B", "A"], dtype="str"))
    for name, security in (("text", text), ("categories", text.astype(names))):
        store.write_table(betas(months, security), tmp_path / name, "betas")
    assert (tmp_path / "text").read_bytes() == (tmp_path / "categories").read_bytes()
    back = store.read_table(tmp_path / "text", ["security"])["security"]
    assert isinstance(back.dtype, pd.CategoricalDtype)
    assert back.tolist() == text.tolist()


def test_categories_must_be_sorted_by_name(tmp_path: Path) -> None:
    months = ["2000-01-31", "2000-01-31"]
    names = pd.CategoricalDtype(pd.Index(["B", "A"], dtype="str"))
    wrong = betas(months, pd.Series(["B", "A"]).astype(names))
    with pytest.raises(pandera.errors.SchemaError, match="sorted and unique"):
        store.write_table(wrong, tmp_path / "betas.parquet", "betas")


@pytest.mark.parametrize(
    ("dates", "fits"),
    [
        (["2000-01-04", "2000-01-05"], True),
        (["2000-01-04 10:00", "2000-01-05 10:00"], False),
        (["2000-01-05", "2000-01-04"], False),
    ],
    ids=["days", "with a time of day", "not sorted"],
)
def test_a_daily_table_has_days(tmp_path: Path, dates: list[str], fits: bool) -> None:
    path = tmp_path / "market.parquet"
    if fits:
        store.write_table(market(dates), path, "market", "daily")
        assert store.read_table(path)["date"].tolist() == list(pd.to_datetime(dates))
    else:
        with pytest.raises(pandera.errors.SchemaError):
            store.write_table(market(dates), path, "market", "daily")
