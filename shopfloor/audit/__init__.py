"""The independent check of a plan; shares no code with the methods."""
