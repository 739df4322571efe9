"""How the solver is set for floors."""

from __future__ import annotations

from ortools.sat.python import cp_model

from shopfloor.openshop.cpsat.solve import ROOM_S
from shopfloor.openshop.method import Effort


def set_parameters(
    solver: cp_model.CpSolver, effort: Effort, workers: int, work: float | None, *, lean: bool
) -> None:
    """Set the solver up; `work` limits it in its own units, `lean` keeps presolve short."""
    chosen = solver.parameters
    chosen.num_workers = workers
    chosen.random_seed = effort.seed % 2**31
    chosen.max_time_in_seconds = max(effort.left_s, ROOM_S)
    chosen.catch_sigint_signal = False
    if work is not None:
        chosen.max_deterministic_time = work
    if lean:
        chosen.linearization_level = 0
        chosen.cp_model_probing_level = 0
        chosen.symmetry_level = 0
