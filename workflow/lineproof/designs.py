"""Which designs of test assets exist, and which weights: one line each."""

from __future__ import annotations

from lineproof.catalog import Entry

DESIGNS: dict[str, Entry] = {
    "single_window": Entry("lineproof.forming:from_single_window", "ranked on one estimate"),
    "supplied": Entry("lineproof.forming:from_supplied", "supplied as return series"),
}

# A label is a template that `facts` fills in with the study's period, a `frequency.Frequency`.
WEIGHTS: dict[str, Entry] = {
    "equal": Entry(
        "lineproof.stats.weights:equal", "equally weighted, rebalanced {period.adjective}"
    ),
    "size": Entry(
        "lineproof.stats.weights:by_size", "weighted by size at the end of the {period.noun} before"
    ),
}
