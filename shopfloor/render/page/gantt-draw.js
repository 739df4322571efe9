// Drawing on a canvas, the same for the screen and for paper. A "surface" says where and what:
// { ctx, scale, width, height, left, right, top, bottom, rowsBottom, head, small, from, to, rows, firstRow,
//   shownRows, rowHeight }; `head` is the part of the frame above the rows, crews lie between `rowsBottom` and
//   `bottom`, `small` is the least size of text in a bar.

const FONT = '"Segoe UI", "Helvetica Neue", Arial, "Liberation Sans", sans-serif';
const INK = "#10202f", QUIET = "#5a6672", HAIR = "#d5dbe1", PAPER = "#ffffff", SHUT = "#bcc5cd";
const NARROW = 7; // below this width bars are bare colour: edges and patterns would only flicker
const LABELS = 600; // more than this many texts inside bars help nobody

const widths = new Map();

function textWidth(ctx, text) {
  const key = `${ctx.font}|${text}`;
  let width = widths.get(key);
  if (width === undefined) {
    if (widths.size > 20000) widths.clear();
    width = ctx.measureText(text).width;
    widths.set(key, width);
  }
  return width;
}

// The longest beginning of `text` that fits, with an ellipsis where it was cut.
function fitted(ctx, text, room) {
  if (textWidth(ctx, text) <= room) return text;
  const letters = Array.from(text);
  let low = 0, high = letters.length;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (ctx.measureText(`${letters.slice(0, middle).join("")}…`).width <= room) low = middle;
    else high = middle - 1;
  }
  return low ? `${letters.slice(0, low).join("")}…` : "";
}

function xOf(s, seconds) {
  return s.left + ((seconds - s.from) / (s.to - s.from)) * (s.right - s.left);
}

function yOf(s, row) {
  return s.top + s.head + (row - s.firstRow) * s.rowHeight;
}

// ---- patterns: the second cue beside brightness -------------------------------------------------

const TILE = 8;
const patternCache = new Map();

function drawTile(ctx, kind) {
  ctx.lineWidth = 1.6;
  ctx.beginPath();
  if (kind === "dots") {
    ctx.arc(2, 2, 0.9, 0, 7);
    ctx.fill();
    return;
  }
  if (kind === "stripes" || kind === "cross") {
    for (const shift of [-TILE, 0, TILE]) {
      ctx.moveTo(shift - 1, TILE + 1);
      ctx.lineTo(shift + TILE + 1, -1);
    }
  }
  if (kind === "back-stripes" || kind === "cross") {
    for (const shift of [-TILE, 0, TILE]) {
      ctx.moveTo(shift - 1, -1);
      ctx.lineTo(shift + TILE + 1, TILE + 1);
    }
  }
  if (kind === "grid") {
    ctx.moveTo(0, 4);
    ctx.lineTo(TILE, 4);
  }
  if (kind === "grid" || kind === "upright") {
    ctx.moveTo(4, 0);
    ctx.lineTo(4, TILE);
  }
  ctx.stroke();
}

function pattern(s, kind, colour) {
  const key = `${kind}|${colour}|${s.scale}`;
  let made = patternCache.get(key);
  if (!made) {
    const tile = document.createElement("canvas");
    tile.width = tile.height = Math.round(TILE * s.scale);
    const ctx = tile.getContext("2d");
    ctx.scale(tile.width / TILE, tile.height / TILE);
    ctx.strokeStyle = ctx.fillStyle = colour;
    drawTile(ctx, kind);
    made = s.ctx.createPattern(tile, "repeat");
    made.setTransform(new DOMMatrix().scale(TILE / tile.width, TILE / tile.height));
    patternCache.set(key, made);
  }
  return made;
}

// Fill a box as a group: colour, then its pattern faintly in the colour of its text.
function fillAs(s, group, x, y, width, height) {
  s.ctx.fillStyle = group.fill;
  s.ctx.fillRect(x, y, width, height);
  if (group.pattern !== "plain" && width >= NARROW) {
    s.ctx.save();
    s.ctx.globalAlpha = 0.34;
    s.ctx.fillStyle = pattern(s, group.pattern, group.ink);
    s.ctx.fillRect(x, y, width, height);
    s.ctx.restore();
  }
}

// ---- bars ---------------------------------------------------------------------------------------

const LIT = { fill: "#000000", ink: "#ffffff", pattern: "plain" };

function barBox(s, bar, row) {
  const x = xOf(s, bars.start[bar]), end = xOf(s, bars.end[bar]);
  const left = Math.max(x, s.left), right = Math.min(end, s.right);
  const pad = s.rowHeight > 26 ? 4 : 2;
  return { x: left, y: yOf(s, row) + pad, width: right - left, height: s.rowHeight - 2 * pad };
}

function lastRow(s) {
  return Math.min(s.firstRow + s.shownRows, s.rows.lists.size);
}

// Call `each(bar, row)` for every bar in sight that `keep` takes.
function inSight(s, keep, each) {
  for (let row = s.firstRow; row < lastRow(s); row++) {
    const list = s.rows.lists.of(row);
    for (let i = firstEndingAfter(list, s.from); i < list.length && bars.start[list[i]] < s.to; i++) {
      if (keep(bars.order[list[i]])) each(list[i], row);
    }
  }
}

// The same for one order alone, without a look at the rest.
function ofOrderInSight(s, order, each) {
  for (const bar of barsOfOrder.of(order)) {
    const row = s.rows.rowOf(bar);
    const shown = row >= s.firstRow && row < lastRow(s);
    if (shown && bars.start[bar] < s.to && bars.end[bar] > s.from) each(bar, row);
  }
}

// Draw the bars that `source` hands on, in the look of `style`; then what `between` draws; then the texts, so
// that nothing covers them.
function paintBars(s, source, style, between = () => {}) {
  const { ctx } = s, roomy = [];
  let edge = -Infinity, edgeRow = -1;
  source((bar, row) => {
    const box = barBox(s, bar, row);
    if (box.width < 1) { // a hair: one a pixel is enough
      if (row === edgeRow && box.x < edge) return;
      [edge, edgeRow, box.width] = [box.x + 1, row, 1];
    }
    const group = style(bar);
    if (box.width < NARROW) {
      ctx.fillStyle = group.fill;
      ctx.fillRect(box.x, box.y, box.width, box.height);
      return;
    }
    box.width -= 1;
    fillAs(s, group, box.x, box.y, box.width, box.height);
    ctx.lineWidth = 1;
    ctx.strokeStyle = "rgba(16,32,47,0.5)";
    ctx.strokeRect(box.x + 0.5, box.y + 0.5, box.width - 1, box.height - 1);
    const ready = paintSetUp(s, bar, box, group);
    if (state.byFamily && isLate(bars.order[bar])) paintLate(s, box);
    if (box.width > 18 && roomy.length < LABELS) roomy.push([bar, box, group, ready]);
  });
  between();
  paintTexts(s, roomy);
}

// The set-up of an operation is the first part of its bar: cross-hatched, up to a line. Returns its width.
function paintSetUp(s, bar, box, group) {
  if (bars.setUpEnd[bar] === bars.start[bar]) return 0;
  const width = Math.min(xOf(s, bars.setUpEnd[bar]) - box.x, box.width - 1);
  if (width < 5) return 0;
  const { ctx } = s;
  ctx.fillStyle = group.fill;
  ctx.fillRect(box.x + 1, box.y + 1, width, box.height - 2);
  ctx.save();
  ctx.globalAlpha = 0.55;
  ctx.fillStyle = pattern(s, "cross", group.ink);
  ctx.fillRect(box.x + 1, box.y + 1, width, box.height - 2);
  ctx.restore();
  ctx.fillStyle = group.ink;
  ctx.fillRect(Math.round(box.x + width), box.y, 1, box.height);
  return width;
}

// In the colours of families a line along the foot marks the bars of late orders.
function paintLate(s, box) {
  const { ctx } = s, y = box.y + box.height - 5;
  ctx.fillStyle = PAPER;
  ctx.fillRect(box.x, y, box.width, 5);
  ctx.fillStyle = "#9c3412";
  ctx.fillRect(box.x, y + 1, box.width, 4);
}

// Names in bars. One size serves the whole chart, the largest at which most of them fit; the others are
// written small where that fits, and else not at all: a shortened name would be another name.
function paintTexts(s, roomy) {
  const { ctx } = s;
  ctx.textBaseline = "middle";
  ctx.textAlign = "center";
  const size = commonSize(s, roomy);
  for (const [bar, box, group, ready] of roomy) {
    const ways = s.rows.inside(bar).flatMap((text) => [[text, size, 600], [text, s.small, 400]]);
    const fits = (room) => ([text, pixels, weight]) => nameWidth(ctx, text, weight) * pixels <= room - 6;
    const run = openPart(s, bar, { ...box, x: box.x + ready, width: box.width - ready });
    const way = ways.find(fits(run.width)), wide = ways.find(fits(box.width));
    if (way === ways[0] || (way && (bars.paused[bar] || wide !== ways[0]))) paintText(s, way, run, group);
    else if (wide && !bars.paused[bar]) paintText(s, wide, box, group, ready > 0);
  }
}

// The longest part of a box in which its bar is worked: closures have texts of their own.
function openPart(s, bar, box) {
  if (!bars.paused[bar]) return box;
  let parts = [[box.x, box.x + box.width]];
  for (const shut of closures) {
    if (shut.row !== null && shut.row !== bars.row[bar]) continue;
    const from = xOf(s, shut.start_s), to = xOf(s, shut.end_s);
    parts = parts.flatMap(([start, end]) => [[start, Math.min(end, from)], [Math.max(start, to), end]]);
  }
  const [start, end] = parts.reduce((a, b) => (b[1] - b[0] > a[1] - a[0] ? b : a));
  return { ...box, x: start, width: Math.max(0, end - start) };
}

function commonSize(s, roomy) {
  const most = Math.min(18, Math.floor(s.rowHeight * 0.45));
  const fits = (size) => ([bar, box]) => nameWidth(s.ctx, s.rows.inside(bar)[0], 600) * size <= box.width - 6;
  for (let size = most; size > s.small + 1; size--) {
    if (roomy.filter(fits(size)).length >= 0.7 * roomy.length) return size;
  }
  return s.small + 1;
}

// Width of a name at one pixel of size.
function nameWidth(ctx, text, weight) {
  ctx.font = `${weight} 100px ${FONT}`;
  return textWidth(ctx, text) / 100;
}

function paintText(s, [text, size, weight], box, group, overSetUp = false) {
  const { ctx } = s, x = box.x + box.width / 2, y = box.y + box.height / 2 + 0.5;
  if (group.pattern !== "plain" || overSetUp) { // a quiet ground, so that the pattern does not run through letters
    const width = nameWidth(ctx, text, weight) * size;
    ctx.fillStyle = group.fill;
    const [top, tall] = overSetUp ? [box.y + 1, box.height - 2] : [y - size * 0.68, size * 1.3];
    ctx.fillRect(x - width / 2 - 3, top, width + 6, tall);
  }
  ctx.font = `${weight} ${size}px ${FONT}`;
  ctx.fillStyle = group.ink;
  ctx.fillText(text, x, y);
}
