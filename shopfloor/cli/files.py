"""The files of a plan, as ``plan`` and ``replan`` write them into the folder of ``--out``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.replan.compare import Comparison

# Rows of a plan; beyond, plan.csv serves: a workbook takes longer to write than the plan to make, and
# nobody prints a hundred thousand sheets.
WORKBOOK_UP_TO, SHEETS_UP_TO = 50_000, 100_000


def write_plan(
    made: Plan,
    out: Path,
    *,
    stamp: str | None = None,
    codes: str | None = None,
    xlsx: bool = True,
    ics: str | None = None,
    moved: Comparison | None = None,
) -> list[Path]:
    """Make every file of a plan in memory, then write them all or none; return them as written.

    Parameters
    ----------
    stamp, codes, xlsx, ics
        As the options of those names.
    moved
        What the plan moves, for one made during the shift: gives moves.html.

    Raises
    ------
    SaveError
        If the disk refuses; then nothing has changed.
    """
    from shopfloor.render.dispatch import dispatch_page
    from shopfloor.render.gantt import gantt_page
    from shopfloor.render.save import save
    from shopfloor.render.tables import plan_csv, plan_json

    text = plan_json(made)
    files: dict[str, bytes | str] = {
        "plan.json": text,
        "plan.csv": plan_csv(made),
        "gantt.html": gantt_page(made, stamp=stamp),
    }
    if moved is not None:
        import hashlib
        from dataclasses import replace

        from shopfloor.render.compare_page import compare_page

        digest = hashlib.sha256(text.encode("utf-8")).hexdigest()
        named = replace(moved, b=replace(moved.b, name="plan.json", sha256=digest))
        files["moves.html"] = compare_page(named, made.shop.clock)
    if len(made.schedule) <= SHEETS_UP_TO:
        files["dispatch.html"] = dispatch_page(made, stamp=stamp, codes=codes)
    if xlsx and len(made.schedule) <= WORKBOOK_UP_TO:
        from shopfloor.render.workbook import plan_xlsx

        files["plan.xlsx"] = plan_xlsx(made, stamp=stamp)
    if ics is not None:
        from shopfloor.render import ics as calendars

        files |= (
            {"plan.ics": calendars.plan_ics(made)} if ics == "plan" else calendars.machine_calendars(made)
        )
    return save(out, files)
