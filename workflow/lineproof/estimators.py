"""Which estimators of beta exist: one line each."""

from __future__ import annotations

from lineproof.catalog import Entry

ESTIMATORS: dict[str, Entry] = {
    "ols": Entry("lineproof.stats.betas:rolling_ols", "ordinary least squares"),
}
