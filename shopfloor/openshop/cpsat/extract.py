"""From the solver's values to starts in seconds."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import Ints
from shopfloor.openshop.cpsat.variables import Model


def starts_of(model: Model, value: Callable[[cp_model.IntVar], int], at_s: Ints | None = None) -> Ints:
    """Return the start of each operation in seconds.

    Parameters
    ----------
    value
        The solver's value of a variable.
    at_s
        Starts of the operations that are not in the model, an entry an operation of the shop.
    """
    starts = np.zeros(len(model.shop), np.int64) if at_s is None else at_s.copy()
    for operation in model.rows:
        starts[operation] = value(model.start[operation]) * model.grid.unit_s
    return starts
