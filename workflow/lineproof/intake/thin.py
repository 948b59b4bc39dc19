"""Periods that were delivered in part: far fewer securities than the periods around have (fault 32)."""

from __future__ import annotations

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from lineproof.intake.faults import N_EXAMPLES, Flag
from lineproof.intake.stopping import counted, stop
from lineproof.periods import Periods

_N_AROUND = 5  # periods on either side
_SHARE = 0.1
_FEWEST_AROUND = 20  # securities; in smaller markets chance empties a period


def judge_thin_periods(
    n_securities: np.ndarray, first: int, periods: Periods, label: str, *, allow_last: bool
) -> Flag:
    """Periods with under a tenth of the securities of those around, as a flag that counts the periods.

    `n_securities` is int64 (n_periods,), from the period numbered `first` on, every period between included; those
    around are the five on either side, of which the median counts.

    Raises KnownProblem when the last period is one of them and `allow_last` is not set.
    """
    usual = _median_around(np.asarray(n_securities, np.int64))
    thin = np.flatnonzero((usual >= _FEWEST_AROUND) & (n_securities < _SHARE * usual))
    said = [_said(periods.name(first + int(i)), int(n_securities[i]), usual[i]) for i in thin]
    if len(thin) and thin[-1] == len(n_securities) - 1 and not allow_last:
        found = f"the last {periods.noun}, {said[-1]}: was it delivered in part?"
        change = (
            "deliver it in full, or leave it out, or set allow_partial_last_month: yes under intake"
        )
        raise stop(label, found, change)
    return Flag(32, len(thin), said[:N_EXAMPLES], {})


def _median_around(n: np.ndarray) -> np.ndarray:
    """Median of the values on either side of each, float64; 0 where there is none."""
    if len(n) < 2:
        return np.zeros(len(n))
    padded = np.pad(n.astype(np.float64), _N_AROUND, constant_values=np.nan)
    windows = sliding_window_view(padded, 2 * _N_AROUND + 1)
    return np.nanmedian(np.delete(windows, _N_AROUND, axis=1), axis=1)


def _said(name: str, n: int, usual: float) -> str:
    return f"{name}, with {counted(n, 'security')} where the periods around have {usual:,.0f}"
