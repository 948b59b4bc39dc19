"""Which designs of test assets exist, which weights, and which rules part a ranking into groups: one line each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from lineproof.catalog import Entry

DESIGNS: dict[str, Entry] = {
    "single_window": Entry("lineproof.forming:from_single_window", "ranked on one variable"),
    "three_windows": Entry(
        "lineproof.forming:from_three_windows",
        "ranked in one window, estimated anew in a second, tested in a third",
    ),
    "double_sort": Entry("lineproof.forming:from_double_sort", "ranked on two variables"),
    "supplied": Entry("lineproof.forming:from_supplied", "supplied as return series"),
}

# A label is a template that `facts` fills in with the study's period, a `frequency.Frequency`.
WEIGHTS: dict[str, Entry] = {
    "equal": Entry(
        "lineproof.stats.weights:equal", "equally weighted, rebalanced {period.adjective}"
    ),
    "buy_and_hold": Entry(
        "lineproof.stats.weights:equal", "equally weighted at formation, then bought and held"
    ),
    "size": Entry(
        "lineproof.stats.weights:by_size", "weighted by size at the end of the {period.noun} before"
    ),
}
# Weights that are set at formation, and then grow with what each member returns.
DRIFTING = frozenset({"buy_and_hold"})

RULES: dict[str, Entry] = {
    "quantiles": Entry("lineproof.stats.sorts:by_quantiles", "parted at quantiles"),
    "equal_counts": Entry("lineproof.stats.sorts:by_equal_counts", "parted by rank"),
}

FORM_EACH = {"month": 1, "quarter": 3, "year": 12}  # how often groups are formed, in months
HOLD_BLOCKS = 48  # months for which blocks are held unless said: Fama and MacBeth 1973
# Betas of groups that their members can get.
ASSIGNED = {
    "none": "no betas",
    "ex_ante": "the group's ex-ante beta",
    "full_period": "the group's beta in the full period",
}


@dataclass(frozen=True)
class Design:
    """How groups are ranked, formed and held.

    `rank_on` and `ante_betas` name estimates, `name` or `name.column`, or columns of the panel;
    `groups` has a number for each variable. `hold` is in months. With `in_blocks` groups are formed
    when the block before has ended; `estimation` is how many months before formation the ranking is
    dated; with `renews` the ex-ante betas are taken anew each year of the hold. `first_formation` is
    the first month that may form groups, as `YYYY-MM`, and `breakpoints` the condition on who sets
    breakpoints, as a screen.
    """

    name: str
    rank_on: tuple[str, ...]
    groups: tuple[int, ...]
    weights: str = "equal"
    form_month: int = 12
    hold: int = 12
    form_each: str = "year"
    ante_betas: tuple[str, ...] = ()
    rule: str = "quantiles"
    dependent: bool = False
    overlap: bool = False
    in_blocks: bool = False
    estimation: int = 0
    renews: bool = False
    first_formation: str | None = None
    breakpoints: dict[str, Any] | None = None
    spread: bool = False
    assign_betas: str = "none"

    def __post_init__(self) -> None:
        if not (self.overlap or self.in_blocks) and self.hold > FORM_EACH[self.form_each]:
            raise ValueError("holding periods overlap")

    def forms(self, month: Any) -> Any:
        """Whether groups can be formed at the end of each month; months as numbers, an array."""
        step = FORM_EACH[self.form_each]
        year, first = (self.first_formation or "0000-01").split("-")
        late_enough = month >= 12 * int(year) + int(first) - 1
        return ((month - (self.form_month - 1)) % step == 0) & late_enough
