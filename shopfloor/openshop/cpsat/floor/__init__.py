"""The exact model of a floor with all its rules, begun at a legal plan. Needs the solver."""
