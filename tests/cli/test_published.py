"""Published optima through the command line: reached and proved, and never beaten.

E. Taillard, E.J.O.R. 64 (1993) 278-285 (4×4, 5×5); C. Guéret, C. Prins, Annals of O.R. 92 (1999) 165-183
(3×3 to 6×6); P. Brucker et al., Discrete Applied Mathematics 76 (1997) 43-59 (j3, j4).
"""

from __future__ import annotations

import pytest

from tests.bench.instances import Instance, instances, orders_csv
from tests.cli.run import shopfloor

GROUPS = {"tai4", "tai5", "gp03", "gp04", "gp05", "gp06", "j3", "j4"}


@pytest.mark.parametrize("group", sorted(GROUPS))
def test_the_published_optimum_is_reached_and_proved(group: str) -> None:
    chosen: list[Instance] = [instance for instance in instances() if instance.group == group]
    assert chosen
    for instance in chosen:
        said = shopfloor("plan", "-", "--json", "--quiet", stdin=orders_csv(instance).encode())
        assert instance.proved
        assert said.json["makespan_s"] == instance.best_known * 60, instance.name
        assert said.json["proved_optimal"] is True, instance.name
