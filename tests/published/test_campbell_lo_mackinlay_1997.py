"""Campbell, Lo and MacKinlay 1997, "The Econometrics of Financial Markets", chapter 5.

True size of the large-sample joint tests at a nominal five per cent, one factor. The printed
values are from memory. Each statistic rises with the distance W, whose exact law is that of the F
statistic, so the size is the F's tail at the W where the statistic reaches its chi-square critical
value: no simulation.
"""

from __future__ import annotations

import pytest
from scipy.optimize import brentq

from lineproof.stats.distributions import joint_critical, joint_p
from lineproof.stats.joint_alpha import ALPHA_STATISTICS, exact_f


def _size(name: str, n_periods: int, n_assets: int) -> float:
    statistic = ALPHA_STATISTICS[name]
    critical = float(joint_critical(0.05, n_assets, float("nan")))
    reached = brentq(
        lambda distance: statistic(distance, n_periods, n_assets, 1).value - critical,
        0.0,
        1000.0,
        xtol=1e-14,
    )
    exact = exact_f(reached, n_periods, n_assets, 1)
    return float(joint_p(exact.value, exact.df1, exact.df2))


@pytest.mark.parametrize(
    ("n_periods", "n_assets", "wald", "lr", "lr_corrected"),
    [
        (60, 10, 0.170, 0.096, 0.051),
        (60, 20, 0.462, 0.211, 0.057),
        (60, 40, 0.985, 0.805, 0.141),
        (120, 10, 0.099, 0.070, 0.050),
        (180, 20, 0.136, 0.082, 0.051),
        (240, 40, 0.257, 0.124, 0.052),
    ],
)
def test_true_size(
    n_periods: int, n_assets: int, wald: float, lr: float, lr_corrected: float
) -> None:
    # Half a unit of the last printed digit.
    assert _size("wald", n_periods, n_assets) == pytest.approx(wald, abs=0.0005)
    assert _size("lr", n_periods, n_assets) == pytest.approx(lr, abs=0.0005)
    assert _size("lr_corrected", n_periods, n_assets) == pytest.approx(lr_corrected, abs=0.0005)


def test_the_f_has_exactly_its_nominal_size() -> None:
    critical = joint_critical(0.05, 10, 49)
    assert float(joint_p(critical, 10, 49)) == pytest.approx(0.05, rel=1e-9)
