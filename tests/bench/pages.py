"""How quick the Gantt page is, beside a stock timeline page of the same plan, in headless Chromium.

Run:  python -m tests.bench.pages [operations ...]      (200, 2,000, 20,000 and 200,000 unless said)

Each figure is the median of three. An action is timed inside the page, from the arrival of its event
until the frame that shows its effect has been painted. "Stock" is `plotly.express.timeline` with all its
defaults, bars as elements of one trace; what it has no control for is done by the call a reader would make.
Beyond 50,000 operations the plan has every rule of the floor, and no stock page stands beside it.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Callable
from datetime import datetime, timedelta
from pathlib import Path
from statistics import median
from typing import Any

from shopfloor.model.results import Plan
from shopfloor.render.gantt import gantt_page
from tests.render.browser import chromium, why_not
from tests.render.plans import SHIFT, hall_plan, many_plan

RUNS = 3
AIMS = {  # ours, by operations
    200: (300, 2500, 30, 70, 100, 250, 800, 5.2),
    2_000: (300, 2500, 30, 70, 170, 500, 800, 5.2),
    20_000: (300, 3500, 50, 100, 300, 700, 800, 5.2),
    200_000: (1000, 4000, 50, 100, 300, 700, 800, 8.0),
}
STOCK_UP_TO = 50_000
COLUMNS = (
    ("build+write", "ms"),
    ("painted", "ms"),
    ("hover", "ms"),
    ("light", "ms"),
    ("zoom", "ms"),
    ("turn rows", "ms"),
    ("nodes", ""),
    ("page", "MB"),
)

# Resolves once `until` holds at the end of a frame and that frame has been handed on.
ARM = """([type]) => {{
  window.timing = new Promise((resolve) => {{
    addEventListener(type, () => {{
      const began = performance.now();
      const look = () => requestAnimationFrame(() => {{
        if (!({until})) return look();
        const channel = new MessageChannel();
        channel.port1.onmessage = () => resolve(performance.now() - began);
        channel.port2.postMessage(0);
      }});
      look();
    }}, {{ capture: true, once: true }});
  }});
}}"""


def timed(page: Any, event: str, act: Callable[[], Any], until: str = "true") -> float:
    """Return the milliseconds from the next `event` until `until` holds in a painted frame."""
    page.evaluate(ARM.format(until=until), [event])
    act()
    return float(page.evaluate("window.timing"))


def load(browser: Any, file: Path, ready: str) -> tuple[Any, float]:
    """Open a file and return the page with the milliseconds until it was painted."""
    page = browser.new_context(viewport={"width": 1440, "height": 900}, offline=True).new_page()
    page.goto(file.as_uri(), wait_until="commit")
    page.wait_for_selector(ready, state="attached", timeout=120_000)
    painted = page.evaluate(
        "new Promise((r) => requestAnimationFrame(() => setTimeout(() => r(performance.now()))))"
    )
    page.wait_for_timeout(300)
    return page, float(painted)


def spread(page: Any, selector: str) -> list[tuple[float, float]]:
    """Return points spread over the upper part of the chart, for the pointer to find bars at."""
    box = page.locator(selector).bounding_box()
    return [
        (box["x"] + box["width"] * (0.25 + 0.05 * k), box["y"] + box["height"] * (0.28 + 0.06 * (k % 6)))
        for k in range(12)
    ]


def measure_ours(browser: Any, plan: Plan, folder: Path) -> list[float]:
    """Return one run of every figure for our page."""
    file = folder / "gantt.html"
    began = time.perf_counter()
    file.write_text(gantt_page(plan), encoding="utf-8")
    built = (time.perf_counter() - began) * 1000
    page, painted = load(browser, file, "html[data-ready]")
    nodes = page.evaluate("document.querySelectorAll('*').length")
    hover, light = [], []
    shown = "!document.getElementById('tip').hidden"
    for x, y in spread(page, "#chart"):
        page.mouse.move(10, 10)
        took = timed(page, "pointermove", lambda x=x, y=y: page.mouse.move(x, y))
        if page.evaluate(shown):
            hover.append(took)
            light.append(timed(page, "pointerup", lambda x=x, y=y: page.mouse.click(x, y)))
        if len(light) == 3:
            break
    zoom = [timed(page, "click", lambda: page.click("#zoom-in")) for _ in range(2)]
    page.click("#whole")
    zoom.append(timed(page, "click", lambda: page.click("#zoom-in")))
    turn = timed(page, "click", lambda: page.click("#as-orders"))
    page.context.close()
    return [built, painted, median(hover), median(light), max(zoom), turn, nodes, file.stat().st_size / 1e6]


def measure_stock(browser: Any, plan: Plan, folder: Path) -> list[float]:
    """Return one run of every figure for a stock timeline page."""
    import pandas as pd
    import plotly.express as px

    file = folder / "stock.html"
    began = time.perf_counter()
    shop, schedule, start = plan.shop, plan.schedule, plan.shop.clock.start or datetime(2026, 1, 1)
    job, machine = shop.operations.job[schedule.operation], shop.operations.machine[schedule.operation]
    frame = pd.DataFrame(
        {
            "order": [shop.orders.ids[j] for j in job],
            "machine": [shop.machines[m].id for m in machine],
            "start": [start + timedelta(seconds=s) for s in schedule.start_s.tolist()],
            "end": [start + timedelta(seconds=s) for s in schedule.end_s.tolist()],
        }
    )
    figure = px.timeline(frame, x_start="start", x_end="end", y="machine", hover_name="order")
    file.write_text(figure.to_html(include_plotlyjs=True), encoding="utf-8")
    built = (time.perf_counter() - began) * 1000
    page, painted = load(browser, file, ".trace.bars .point path")
    nodes = page.evaluate("document.querySelectorAll('*').length")
    page.evaluate("window.gd = document.querySelector('.js-plotly-plot')")
    hover = []
    for x, y in spread(page, ".plotly .nsewdrag"):
        page.mouse.move(10, 10)
        page.wait_for_timeout(120)
        shown = (
            "document.querySelector('.hoverlayer .hovertext') !== null || performance.now() - began > 3000"
        )
        took = timed(page, "mousemove", lambda x=x, y=y: page.mouse.move(x, y, steps=2), shown)
        if took < 3000:
            hover.append(took)
        if len(hover) == 3:
            break
    colours = "gd.data[0].hovertext.map((o) => o === gd.data[0].hovertext[0] ? '#000' : '#ccc')"
    light = call(page, f"Plotly.restyle(gd, {{'marker.color': [{colours}]}})")
    first, second = (f"{start + timedelta(hours=h):%Y-%m-%d %H:%M}" for h in (0, 8))
    zoom = call(page, f"Plotly.relayout(gd, {{'xaxis.range': ['{first}', '{second}']}})")
    turn = call(page, "Plotly.update(gd, {y: [gd.data[0].hovertext]}, {'yaxis.type': 'category'})")
    page.context.close()
    return [
        built,
        painted,
        median(hover) if hover else float("nan"),
        light,
        zoom,
        turn,
        nodes,
        file.stat().st_size / 1e6,
    ]


def call(page: Any, code: str) -> float:
    """Return the milliseconds of a call until its frame is painted."""
    return timed(
        page, "stir", lambda: page.evaluate(f"() => {{ dispatchEvent(new Event('stir')); {code}; }}")
    )


def row(name: str, figures: list[float] | tuple[float, ...]) -> str:
    """Return one line of the table."""
    cells = [
        f"{value:>11,.1f}" if unit == "MB" else f"{value:>11,.0f}"
        for value, (_, unit) in zip(figures, COLUMNS, strict=True)
    ]
    return f"{name:<16}" + " ".join(cells)


def main(sizes: list[int]) -> None:
    """Measure and print."""
    if why_not():
        sys.exit(why_not())
    head = f"{'':<16}" + " ".join(f"{f'{name} {unit}'.strip():>11}" for name, unit in COLUMNS)
    with tempfile.TemporaryDirectory() as name, chromium() as browser:
        folder = Path(name)
        for size in sizes:
            many = size > STOCK_UP_TO
            plan = many_plan(size, floor=True) if many else hall_plan(size, clock=SHIFT)
            print(f"\n{len(plan.schedule):,} operations\n{head}")
            for label, measure in (("ours", measure_ours), *(() if many else [("stock", measure_stock)])):
                runs = [measure(browser, plan, folder) for _ in range(RUNS)]
                print(row(label, [median(column) for column in zip(*runs, strict=True)]), flush=True)
            if size in AIMS:
                print(row("aim at most", AIMS[size]))


if __name__ == "__main__":
    main([int(text.replace(",", "")) for text in sys.argv[1:]] or sorted(AIMS))
