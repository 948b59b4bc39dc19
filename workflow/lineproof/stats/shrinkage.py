"""Betas drawn towards a prior: the cross-section of their date, or a fixed value."""

from __future__ import annotations

import numpy as np


def to_cross_section(
    beta: np.ndarray, se: np.ndarray, date: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Posterior means and standard deviations of betas whose prior is the cross-section of their date (Vasicek 1973).

    `beta`, `se` and `date` are (n,). The prior's mean b and variance s² are those of all betas of the date (divisor
    n − 1); the posterior mean is (b/s² + β/se²) / (1/s² + 1/se²) and its variance 1 / (1/s² + 1/se²). As in the source
    s² is the variance of estimates, their sampling errors included. A beta alone at its date has no prior and stays.
    """
    which, n = np.unique(date, return_inverse=True, return_counts=True)[1:]
    centre = (np.bincount(which, weights=beta) / n)[which]
    away = beta - centre
    prior = (np.bincount(which, weights=away**2) / np.maximum(n - 1, 1))[which]
    both = prior + se**2
    keeps = np.divide(prior, both, out=np.ones_like(beta), where=both > 0)
    alone = n[which] == 1
    return (
        np.where(alone, beta, centre + keeps * away),
        np.where(alone, se, np.sqrt(keeps) * se),
    )


def to_fixed(
    beta: np.ndarray, se: np.ndarray, date: np.ndarray, *, weight: float, to: float
) -> tuple[np.ndarray, np.ndarray]:
    """weight · β + (1 − weight) · `to`, with standard error weight · se (Blume 1971).

    The arrays are (n,); `date` plays no part. A weight of about two thirds, towards one, is common practice.
    """
    return weight * beta + (1 - weight) * to, weight * se
