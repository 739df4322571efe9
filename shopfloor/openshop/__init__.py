"""Methods that turn a shop into a schedule, each saying what it accepts and what it proves."""
