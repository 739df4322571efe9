"""How hypothesis draws: anew each time on a developer's machine, the same each time where `CI` is set.

So a rare counterexample is found by somebody who can look at it, and a run of the checks repeats.
"""

from __future__ import annotations

import os

from hypothesis import HealthCheck, settings

settings.register_profile("here", deadline=None, suppress_health_check=[HealthCheck.too_slow])
settings.register_profile("ci", settings.get_profile("here"), derandomize=True, print_blob=True)
settings.load_profile("ci" if os.environ.get("CI") else "here")
