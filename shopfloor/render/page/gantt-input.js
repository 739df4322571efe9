// Pointer, wheel and keys.

const once = (() => { // the last request of each kind, carried out before the next frame is drawn
  const waiting = new Map();
  return (kind, act) => {
    if (!waiting.size) {
      requestAnimationFrame(() => {
        const acts = [...waiting.values()];
        waiting.clear();
        for (const each of acts) each();
      });
    }
    waiting.set(kind, act);
  };
})();

function place(event) {
  const rect = chart.getBoundingClientRect();
  return [event.clientX - rect.left, event.clientY - rect.top];
}

// ---- pointer: hover shows, a click lights, a drag moves the window --------------------------------

let drag = null;

function hoverOn(bar, x, y) {
  if (bar !== state.hover) {
    state.hover = bar;
    repaintMarks();
    chart.style.cursor = bar >= 0 ? "pointer" : "";
  }
  showTip(bar, x, y, bar < 0 && x !== undefined ? thingUnder(x, y) : null);
}

function thingUnder(x, y) {
  const rect = chart.getBoundingClientRect(), { from, to, firstRow } = state;
  return thingAt({ ...box, from, to, firstRow }, x - rect.left, y - rect.top);
}

function dragTo(event) {
  const [x, y] = place(event);
  if (!drag.moving && Math.hypot(x - drag.x, y - drag.y) < 5) return;
  drag.moving = true;
  hoverOn(-1);
  chart.style.cursor = "grabbing";
  const perPixel = (drag.to - drag.from) / (box.right - box.left);
  const by = (drag.x - x) * perPixel;
  once("window", () => setWindow(drag ? drag.from + by : state.from, drag ? drag.to + by : state.to));
  once("rows", () => drag && setFirstRow(drag.firstRow + (drag.y - y) / box.rowHeight));
}

function endDrag(event) {
  if (!drag) return;
  const { moving } = drag;
  drag = null;
  chart.style.cursor = "";
  if (moving || event.type !== "pointerup") return;
  const bar = barUnder(...place(event));
  state.focus = bar;
  light(bar >= 0 && bars.order[bar] !== state.lit ? bars.order[bar] : -1);
  if (event.pointerType === "mouse") hoverOn(bar, event.clientX, event.clientY);
}

chart.addEventListener("pointermove", (event) => {
  if (drag) dragTo(event);
  else if (event.pointerType === "mouse") hoverOn(barUnder(...place(event)), event.clientX, event.clientY);
});
chart.addEventListener("pointerdown", (event) => {
  if (event.button !== 0 || event.target === scroller) return;
  const [x, y] = place(event);
  drag = { x, y, from: state.from, to: state.to, firstRow: state.firstRow, moving: false };
  chart.setPointerCapture(event.pointerId);
});
chart.addEventListener("pointerup", endDrag);
chart.addEventListener("pointercancel", endDrag);
chart.addEventListener("pointerleave", () => drag || hoverOn(-1));

// The wheel scrolls rows where they do not all fit, else it zooms; with Ctrl it always zooms, with Shift
// or sideways it moves in time.
chart.addEventListener("wheel", (event) => {
  event.preventDefault();
  const unit = event.deltaMode === 1 ? 33 : 1, down = event.deltaY * unit, across = event.deltaX * unit;
  const sideways = event.shiftKey ? down || across : Math.abs(across) > Math.abs(down) ? across : 0;
  const pixels = box.right - box.left;
  wheel.pan += sideways / pixels;
  const zooms = event.ctrlKey || scroller.hidden;
  if (!sideways && zooms) wheel.zoom *= Math.exp(Math.max(-1, Math.min(1, down / 400)));
  else if (!sideways) wheel.rows += down / 40;
  const at = timeAt(Math.max(box.left, Math.min(place(event)[0], box.right)));
  once("wheel", () => {
    const { pan: by, zoom: factor, rows } = wheel;
    Object.assign(wheel, { pan: 0, zoom: 1, rows: 0 });
    if (by) pan(by);
    if (factor !== 1) zoom(factor, at);
    const whole = Math.trunc(rows);
    wheel.rows = rows - whole;
    if (whole) setFirstRow(state.firstRow + whole);
  });
}, { passive: false });
const wheel = { pan: 0, zoom: 1, rows: 0 };

scroller.addEventListener("scroll", () => {
  once("scroll", () => {
    const row = Math.round(scroller.scrollTop / box.rowHeight);
    if (row !== state.firstRow) {
      state.firstRow = Math.max(0, Math.min(row, state.rows.lists.size - box.shownRows));
      repaint();
    }
  });
});

// ---- keys -----------------------------------------------------------------------------------------

function focusOn(bar) {
  if (bar < 0) return;
  state.focus = bar;
  bringIntoSight(bar);
  repaintMarks();
  sayBar(bar);
  const rect = chart.getBoundingClientRect(), { from, to, firstRow } = state;
  const b = barBox({ ...box, from, to, firstRow }, bar, state.rows.rowOf(bar));
  showTip(bar, rect.left + b.x, rect.top + b.y + b.height - 10);
}

// Where the arrow keys begin: the first bar in sight.
function firstInSight() {
  for (let row = state.firstRow; row < state.rows.lists.size; row++) {
    const list = state.rows.lists.of(row), at = firstEndingAfter(list, state.from);
    if (at < list.length) return list[at];
  }
  return bars.size ? 0 : -1;
}

function step(right, down) {
  const known = state.focus >= 0 && state.rows.rowOf(state.focus) >= 0;
  focusOn(known ? neighbour(state.rows, state.focus, right, down) : firstInSight());
}

function alongRow(end) {
  if (state.focus < 0) return step(0, 0);
  const list = state.rows.lists.of(state.rows.rowOf(state.focus));
  focusOn(list[end ? list.length - 1 : 0]);
}

function clear() {
  state.focus = -1;
  finder.value = "";
  state.matches = null;
  foundOrders = [];
  showTip(-1);
  light(-1);
}

const KEYS = {
  ArrowRight: () => step(1, 0),
  ArrowLeft: () => step(-1, 0),
  ArrowDown: () => step(0, 1),
  ArrowUp: () => step(0, -1),
  Home: () => alongRow(false),
  End: () => alongRow(true),
  Enter: () => state.focus >= 0 && light(bars.order[state.focus] === state.lit ? -1 : bars.order[state.focus]),
  " ": () => KEYS.Enter(),
  Escape: clear,
  "+": () => zoom(0.5),
  "=": () => zoom(0.5),
  "-": () => zoom(2),
  0: () => setWindow(0, given.horizon_s),
  PageDown: () => setFirstRow(state.firstRow + box.shownRows - 1),
  PageUp: () => setFirstRow(state.firstRow - box.shownRows + 1),
};
const SHIFTED = { ArrowRight: () => pan(0.25), ArrowLeft: () => pan(-0.25) };

chart.addEventListener("keydown", (event) => {
  if (event.ctrlKey || event.metaKey || event.altKey || event.target !== chart) return;
  const act = (event.shiftKey && SHIFTED[event.key]) || KEYS[event.key];
  if (!act) return;
  event.preventDefault();
  act();
});
chart.addEventListener("blur", () => {
  showTip(-1);
  if (state.focus >= 0) {
    state.focus = -1;
    repaintMarks();
  }
});

// ---- buttons and search ---------------------------------------------------------------------------

function onClick(id, act) {
  byId(id).addEventListener("click", act);
}

function toggled(button) {
  return button.getAttribute("aria-pressed") !== "true";
}

onClick("as-orders", (event) => setRows(toggled(event.currentTarget) ? "orders" : "machines"));
onClick("late-only", (event) => setLateOnly(toggled(event.currentTarget)));
onClick("by-family", (event) => setByFamily(toggled(event.currentTarget)));
onClick("zoom-in", () => zoom(0.5));
onClick("zoom-out", () => zoom(2));
onClick("opening", () => setWindow(...openingWindow()));
onClick("whole", () => setWindow(0, given.horizon_s));
onClick("table-before", () => turnTable(-1));
onClick("table-after", () => turnTable(1));
finder.addEventListener("input", () => once("search", search));
finder.addEventListener("keydown", (event) => {
  if (event.key === "Enter") lightNextFound();
  if (event.key === "Escape") clear();
});
byId("table").addEventListener("toggle", () => byId("table").open && fillTable());

// The now line follows this computer's clock; off until asked for, so that the page itself stays the same.
let ticking = null;

function setNow(on) {
  byId("now").setAttribute("aria-pressed", String(on));
  state.nowShown = on;
  clearInterval(ticking);
  const follow = () => {
    const here = new Date(), zone = here.getTimezoneOffset() * 60;
    const moment = Math.floor(here.getTime() / 1000) - zone - startOfClock;
    state.now = moment - offsetAt(moment);
    relay();
  };
  if (on) {
    follow();
    ticking = setInterval(follow, 60000);
  } else {
    relay();
  }
}
onClick("now", (event) => setNow(toggled(event.currentTarget)));
