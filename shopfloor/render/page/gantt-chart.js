// The chart on the screen: what it shows now, the frame that plotly draws, the two canvases over it.
// The lower canvas holds all bars and is drawn anew when the window moves; the upper one holds lines,
// the lit order and what the pointer is on, so that these cost little at any size of plan.

const byId = (id) => document.getElementById(id);
const chart = byId("chart"), frame = byId("frame"), scroller = byId("scroller");
const lower = byId("bars"), upper = byId("marks");

const AXIS = 38, FOOT = 12, LOWEST_ROW = 24, HIGHEST_ROW = 60, SHORTEST_S = 60;

const state = {
  rows: machineRows(),
  from: 0,
  to: 1,
  firstRow: 0,
  lit: -1, // an order
  matches: null, // orders found by the search, or null without a search
  lateOnly: false,
  byFamily: given.by_family, // the colours
  hover: -1, // a bar
  focus: -1, // a bar
  now: given.now_s, // seconds, or null when the line is off
  nowShown: given.now_s !== null,
};

function lines() {
  if (!state.nowShown || state.now === null) return given.lines;
  const text = `now ${say(Math.floor(state.now / 60) * 60)}`;
  return [...given.lines, { kind: "now", at_s: state.now, text, short: text }];
}

// Orders that stand out now: found and, if asked, late; null when all are alike.
function standOut() {
  const { matches, lateOnly } = state;
  if (!matches && !lateOnly) return null;
  return (order) => (!matches || matches[order] === 1) && (!lateOnly || isLate(order));
}

// ---- geometry -----------------------------------------------------------------------------------

const gutterWish = (() => {
  const ctx = lower.getContext("2d");
  ctx.font = `600 16px ${FONT}`;
  const wish = (name, binds) => ctx.measureText(oneLine(name)).width + (binds ? 58 : 18);
  let widest = 60;
  for (const machine of machines) widest = Math.max(widest, wish(machine.label, machine.binds));
  for (const crew of crews) widest = Math.max(widest, wish(crew.crew, crew.binds));
  for (let order = 0; order < Math.min(orders.size, 400); order++) {
    widest = Math.max(widest, wish(orders.ids[order], order === orders.binds));
  }
  return Math.ceil(widest);
})();

function geometry(width, height, rows, scale) {
  const head = lines().length * HEAD_ROW + 4;
  const room = Math.max(LOWEST_ROW, height - AXIS - head - crewRoom() - FOOT), size = Math.max(1, rows.lists.size);
  const fits = size * LOWEST_ROW <= room;
  const shownRows = fits ? size : Math.floor(room / LOWEST_ROW);
  const rowHeight = fits ? Math.min(HIGHEST_ROW, room / size) : room / shownRows;
  return {
    scale, width, height, small: 11, rows, head, shownRows, rowHeight,
    left: Math.min(gutterWish, 230, Math.round(width * 0.3)),
    right: width - 18, // room for the scroll bar, needed or not, so that turning the rows moves nothing
    top: AXIS,
    rowsBottom: AXIS + head + shownRows * rowHeight,
    bottom: AXIS + head + shownRows * rowHeight + crewRoom(),
  };
}

let box = null;

function surface(canvas) {
  const ctx = canvas.getContext("2d");
  ctx.setTransform(box.scale, 0, 0, box.scale, 0, 0);
  ctx.clearRect(0, 0, box.width, box.height);
  return { ...box, ctx, from: state.from, to: state.to, firstRow: state.firstRow };
}

// ---- plotly's part: the time axis and its grid --------------------------------------------------

function axisTicks(from, to, width) {
  const widest = onTheWall ? 78 : 68;
  const found = ticks(from, to, ((to - from) / width) * widest);
  return { tickvals: found.map((tick) => onAxis(tick.at)), ticktext: found.map((tick) => tick.text) };
}

function drawFrame() {
  const axis = {
    type: onTheWall ? "date" : "linear",
    range: [onAxis(state.from), onAxis(state.to)],
    side: "top",
    tickmode: "array",
    ...axisTicks(state.from, state.to, box.right - box.left),
    tickfont: { family: FONT, size: 15, color: INK },
    tickangle: 0,
    ticks: "outside",
    ticklen: 5,
    tickcolor: QUIET,
    showline: true,
    linecolor: INK,
    gridcolor: "#dfe5ea",
    zeroline: false,
    fixedrange: true,
    automargin: false,
  };
  const layout = {
    ...frameSize(),
    xaxis: axis,
    yaxis: { type: "linear", range: [0, 1], visible: false, fixedrange: true },
    paper_bgcolor: PAPER,
    plot_bgcolor: PAPER,
    hovermode: false,
    dragmode: false,
    showlegend: false,
  };
  Plotly.newPlot(frame, [], layout, { staticPlot: true, displayModeBar: false, typesetMath: false });
}

function frameSize() {
  const margin = { l: box.left, r: box.width - box.right, t: box.top, b: box.height - box.bottom, pad: 0 };
  return { width: box.width, height: box.height, margin };
}

// Both axis types go along each time, so that plotly never guesses them anew.
function moveFrame(more = {}) {
  const shown = axisTicks(state.from, state.to, box.right - box.left);
  Plotly.relayout(frame, {
    "xaxis.type": onTheWall ? "date" : "linear",
    "yaxis.type": "linear",
    "xaxis.range": [onAxis(state.from), onAxis(state.to)],
    "xaxis.tickvals": shown.tickvals,
    "xaxis.ticktext": shown.ticktext,
    ...more,
  });
}

// ---- painting -----------------------------------------------------------------------------------

function lookOf(bar) {
  return state.byFamily ? familyGroups[families[bars.family[bar]].group] : groups[bars.group[bar]];
}

function paintLower(s) {
  paintGround(s);
  if (loadShown(s)) {
    paintLoad(s, s.from);
    paintClosures(s);
  } else {
    if (load && s.rows.kind === "machines" && s.to > given.detail_s) paintLoad(s, given.detail_s);
    paintBars(s, (each) => inSight(s, () => true, each), lookOf, () => {
      paintGaps(s);
      paintChangeovers(s);
      paintWays(s, (each) => inSight(s, () => true, each));
      paintClosures(s);
      paintDues(s);
    });
  }
  paintNames(s);
  paintCrews(s);
  paintCorner(s);
  paintTrack(s);
}

// Over the names: which day the left edge of the window lies on, or that time is elapsed; which rows these are.
function paintCorner(s) {
  s.ctx.font = `13px ${FONT}`;
  s.ctx.textAlign = "left";
  s.ctx.textBaseline = "middle";
  s.ctx.fillStyle = QUIET;
  const day = onTheWall ? dayName(wall(Math.max(0, s.from))) : "h:mm elapsed";
  s.ctx.fillText(fitted(s.ctx, day, s.left - 36), 8, s.top - 14);
  const size = s.rows.lists.size;
  if (s.shownRows >= size) return;
  const rows = `${s.firstRow + 1} – ${lastRow(s)} of ${size.toLocaleString("en-GB")}`, room = s.left - 16;
  const text = textWidth(s.ctx, `rows ${rows}`) <= room ? `rows ${rows}` : rows;
  s.ctx.fillText(fitted(s.ctx, text, room), 8, s.top + s.head - 12);
}

function paintUpper(s) {
  const keep = standOut();
  if (keep || state.lit >= 0) {
    s.ctx.fillStyle = "rgba(255,255,255,0.7)";
    s.ctx.fillRect(s.left, s.top + s.head, s.right - s.left, s.rowsBottom - s.top - s.head);
  }
  if (keep) paintBars(s, (each) => inSight(s, keep, each), lookOf);
  if (state.lit >= 0) {
    paintBars(s, (each) => ofOrderInSight(s, state.lit, each), () => LIT);
    paintWays(s, (each) => ofOrderInSight(s, state.lit, each));
    s.ctx.fillStyle = "#000000";
    ofOrderInSight(s, state.lit, (bar, row) => s.ctx.fillRect(0, yOf(s, row) + 1, 5, s.rowHeight - 1));
  }
  paintLines(s, lines());
  if (state.hover >= 0) {
    ofOrderInSight(s, bars.order[state.hover], (bar, row) => outline(s, bar, row, bar === state.hover ? 3 : 2));
  }
  if (state.focus >= 0) {
    ofOrderInSight(s, bars.order[state.focus], (bar, row) => {
      if (bar === state.focus) outline(s, bar, row, 4);
    });
  }
}

function outline(s, bar, row, thick) {
  const b = barBox(s, bar, row), { ctx } = s, out = thick / 2;
  ctx.strokeStyle = PAPER;
  ctx.lineWidth = thick + 2;
  ctx.strokeRect(b.x - out, b.y - out, b.width - 1 + thick, b.height + thick);
  ctx.strokeStyle = INK;
  ctx.lineWidth = thick;
  ctx.strokeRect(b.x - out, b.y - out, b.width - 1 + thick, b.height + thick);
}

const repaintMarks = () => paintUpper(surface(upper));

function repaint() {
  paintLower(surface(lower));
  repaintMarks();
  byId("drawn").textContent = loadText();
}

function toMinute(seconds) {
  return Math.round(seconds / 60) * 60;
}

// From when to when the window shows the plan, to the minute.
function shownMinutes() {
  return [toMinute(Math.max(0, state.from)), toMinute(Math.min(given.horizon_s, state.to))];
}

// ---- moving about -------------------------------------------------------------------------------

function setWindow(from, to) {
  const margin = 0.02, longest = given.horizon_s * (1 + 2 * margin);
  const width = Math.min(Math.max(to - from, Math.min(SHORTEST_S, longest)), longest);
  const middle = (from + to) / 2, slack = margin * width;
  const least = -slack, most = given.horizon_s + slack - width;
  state.from = Math.max(least, Math.min(middle - width / 2, Math.max(least, most)));
  state.to = state.from + width;
  moveFrame();
  repaint();
}

function openingWindow() {
  const [from, to] = given.window_s, slack = (to - from) * 0.012;
  return [from - slack, to + slack];
}

function zoom(factor, at = (state.from + state.to) / 2) {
  setWindow(at - (at - state.from) * factor, at + (state.to - at) * factor);
}

function pan(share) {
  const by = (state.to - state.from) * share;
  setWindow(state.from + by, state.to + by);
}

function setFirstRow(row) {
  const last = Math.max(0, state.rows.lists.size - box.shownRows);
  const next = Math.max(0, Math.min(Math.round(row), last));
  if (next === state.firstRow) return;
  state.firstRow = next;
  scroller.scrollTop = next * box.rowHeight;
  repaint();
}

function bringIntoSight(bar) {
  const row = state.rows.rowOf(bar);
  if (row < 0) return;
  if (row < state.firstRow || row >= state.firstRow + box.shownRows) setFirstRow(row - (box.shownRows >> 1));
  const width = state.to - state.from;
  if (bars.start[bar] < state.from) setWindow(bars.start[bar] - width * 0.1, bars.start[bar] + width * 0.9);
  else if (bars.end[bar] > state.to) {
    const from = Math.min(bars.start[bar] - width * 0.1, bars.end[bar] - width * 0.9);
    setWindow(from, from + width);
  }
}

// Where fewer rows fit than before, the row that the reader looks at stays.
function keepInSight() {
  const bar = state.focus >= 0 ? state.focus : state.lit >= 0 ? barsOfOrder.of(state.lit)[0] : -1;
  const row = bar >= 0 ? state.rows.rowOf(bar) : -1;
  if (row >= state.firstRow + box.shownRows) state.firstRow = row - box.shownRows + 1;
}

// Rows may have changed in number or height: measure, set up canvases and scroll bar, draw everything.
function relay() {
  const scale = Math.min(window.devicePixelRatio || 1, 3);
  const before = box;
  box = geometry(chart.clientWidth, chart.clientHeight, state.rows, scale);
  const resized = !before || ["width", "height", "scale"].some((key) => before[key] !== box[key]);
  if (resized) {
    for (const canvas of [lower, upper]) {
      canvas.width = Math.round(box.width * scale);
      canvas.height = Math.round(box.height * scale);
    }
  }
  const size = state.rows.lists.size, scrolls = size > box.shownRows;
  scroller.hidden = !scrolls;
  scroller.firstElementChild.style.height = `${size * box.rowHeight}px`;
  scroller.style.top = `${box.top + box.head}px`;
  scroller.style.height = `${box.shownRows * box.rowHeight}px`;
  if (before && before.shownRows > box.shownRows) keepInSight();
  state.firstRow = Math.max(0, Math.min(state.firstRow, size - box.shownRows));
  scroller.scrollTop = state.firstRow * box.rowHeight;
  const framed = before && ["right", "bottom", "left", "top"].every((key) => before[key] === box[key]);
  if (!before) drawFrame();
  else if (resized || !framed) moveFrame(frameSize());
  repaint();
}

// What the pointer is on, from the plot's rectangle and a binary search in one row.
function barUnder(x, y) {
  if (x < box.left || x > box.right || y < box.top + box.head || y >= box.rowsBottom) return -1;
  if (loadShown({ ...box, from: state.from, to: state.to, firstRow: state.firstRow })) return -1;
  const row = state.firstRow + Math.floor((y - box.top - box.head) / box.rowHeight);
  if (row >= state.rows.lists.size) return -1;
  const perPixel = (state.to - state.from) / (box.right - box.left);
  return barAt(state.rows, row, timeAt(x), 3 * perPixel);
}

function timeAt(x) {
  return state.from + ((x - box.left) / (box.right - box.left)) * (state.to - state.from);
}
