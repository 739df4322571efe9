"""The floor with all its rules: where an operation may stand, list schedules, and their improvement."""
