"""Climbing a concave function by its subgradients: every multiplier with a step of its own.

Momentum and a step scaled by recent gradients (D. P. Kingma, J. Ba, Adam, ICLR 2015). Only sums,
products, quotients and square roots, which every machine rounds alike, so that bounds repeat.
"""

from __future__ import annotations

import numpy as np

from shopfloor.model.shop import Floats

REMEMBERED, SQUARES = 0.8, 0.95  # shares of the past in direction and in scale
TINY = 1e-9


class Climb:
    """Multipliers, none of them negative, on their way up.

    Parameters
    ----------
    values
        Where to begin; changed in place.
    """

    def __init__(self, values: Floats) -> None:
        self.values = values
        self._mean, self._square = np.zeros_like(values), np.zeros_like(values)
        self._first, self._second = 1.0, 1.0

    def step(self, gradient: Floats, length: float) -> None:
        """Move every value by about `length` or less along the gradient."""
        self._mean += (1 - REMEMBERED) * (gradient - self._mean)
        self._square += (1 - SQUARES) * (gradient * gradient - self._square)
        self._first *= REMEMBERED
        self._second *= SQUARES
        mean, square = self._mean / (1 - self._first), self._square / (1 - self._second)
        self.values += length * mean / (np.sqrt(np.maximum(square, 0.0)) + TINY)
        np.maximum(self.values, 0.0, out=self.values)
