"""``python -m shopfloor`` is the command line."""

from shopfloor.cli.main import run

run()
