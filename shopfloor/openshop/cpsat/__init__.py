"""The general model in OR-Tools CP-SAT. Only this package imports the solver."""
