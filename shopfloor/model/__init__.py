"""What a shop, a schedule and a plan are. Knows nothing of files, methods or solvers."""
