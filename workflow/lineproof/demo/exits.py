"""Why securities leave the demo market, and the final return their holders get."""

from __future__ import annotations

import numpy as np

CODES = ("ACQ", "FAIL", "MOVE")  # acquired, failed, moved to another exchange
CHEAP = 5.0


def draw_exits(rng: np.random.Generator, last_price: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Reason code and final return (decimal) of each security, should it leave.

    `last_price` is an array (n_securities,). Cheap securities mostly fail. The final return
    comes on top of the last month's return and is not part of the market return.
    """
    n_securities = len(last_price)
    chance = rng.random(n_securities)
    fails = chance < np.where(last_price < CHEAP, 0.7, 0.15)
    moves = ~fails & (chance > 0.9)
    loss = rng.uniform(-0.9, -0.2, n_securities)
    gain = 0.03 + 0.04 * rng.standard_normal(n_securities)
    change = 0.02 * rng.standard_normal(n_securities)
    code = np.array(CODES)[np.select([fails, moves], [1, 2], default=0)]
    return code, np.select([fails, moves], [loss, change], default=gain)
