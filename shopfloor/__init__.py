"""Shopfloor: from a spreadsheet of work orders to a proved sequence for every machine.

The names below load their modules on first use, so that ``import shopfloor`` costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from shopfloor.model.results import Plan
    from shopfloor.model.shop import Shop
    from shopfloor.pipeline import plan
    from shopfloor.read.orders import read_orders
    from shopfloor.render.gantt import gantt_figure
    from shopfloor.render.notebook import plan_html

__version__ = "0.1.0"
__all__ = ["Plan", "Shop", "gantt_figure", "plan", "plan_html", "read_orders"]

_HOMES = {
    "Plan": "shopfloor.model.results",
    "Shop": "shopfloor.model.shop",
    "gantt_figure": "shopfloor.render.gantt",
    "plan_html": "shopfloor.render.notebook",
    "plan": "shopfloor.pipeline",
    "read_orders": "shopfloor.read.orders",
}


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'shopfloor' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted([*__all__, "__version__"])
