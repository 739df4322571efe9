"""Runs the command line in this process and hands back what a user would see."""

from __future__ import annotations

import contextlib
import io
import json
import sys
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from unittest import mock

from shopfloor.cli.main import run

DATA = Path(__file__).parents[2] / "data"


@dataclass(frozen=True)
class Said:
    """Exit code and both streams."""

    code: int
    out: str
    err: str

    @property
    def json(self) -> Any:
        return json.loads(self.out)


def shopfloor(*arguments: object, stdin: bytes = b"") -> Said:
    """Run ``shopfloor ARGUMENTS``; an unexpected error propagates with its traceback, as it would."""
    out, err, code = io.StringIO(), io.StringIO(), 0
    source = io.TextIOWrapper(io.BytesIO(stdin))
    with (
        mock.patch.object(sys, "argv", ["shopfloor", *map(str, arguments)]),
        mock.patch.object(sys, "stdin", source),
        contextlib.redirect_stdout(out),
        contextlib.redirect_stderr(err),
    ):
        try:
            run()
        except SystemExit as end:
            code = int(end.code or 0)
    return Said(code, out.getvalue(), err.getvalue())
