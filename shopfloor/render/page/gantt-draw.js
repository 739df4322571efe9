// Drawing on a canvas, the same for the screen and for paper. A "surface" says where and what:
// { ctx, scale, left, right, top, bottom, head, width, height, small, from, to, rows, firstRow, shownRows, rowHeight }.

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
    s.ctx.globalAlpha = 0.38;
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
    if (box.width > 18 && roomy.length < LABELS) roomy.push([bar, box, group]);
  });
  between();
  paintTexts(s, roomy);
}

function paintTexts(s, roomy) {
  const { ctx } = s;
  ctx.textBaseline = "middle";
  ctx.textAlign = "center";
  for (const [bar, box, group] of roomy) {
    for (const [text, size, weight] of candidates(s, bar)) {
      ctx.font = `${weight} ${size}px ${FONT}`;
      const width = textWidth(ctx, text);
      if (width > box.width - 6 || size > box.height) continue;
      const x = box.x + box.width / 2, y = box.y + box.height / 2 + 0.5;
      if (group.pattern !== "plain") { // a quiet ground, so that the pattern does not run through letters
        ctx.fillStyle = group.fill;
        ctx.fillRect(x - width / 2 - 3, y - size * 0.68, width + 6, size * 1.3);
      }
      ctx.fillStyle = group.ink;
      ctx.fillText(text, x, y);
      break;
    }
  }
}

// Ways to write a bar's name, the best first: large and heavy, else small; whole, else without the unit.
function candidates(s, bar) {
  const large = Math.max(12, Math.min(14, Math.floor(s.rowHeight * 0.4)));
  return s.rows.inside(bar).flatMap((text) => [[text, large, 600], [text, 12, 400], [text, s.small, 400]]);
}

// ---- what lies under and between the bars -------------------------------------------------------

function paintGround(s) {
  const { ctx } = s, last = lastRow(s);
  if (given.shift_end_s !== null && given.shift_end_s < s.to) {
    const x = Math.max(s.left, xOf(s, given.shift_end_s));
    ctx.fillStyle = "rgba(90,102,114,0.13)";
    ctx.fillRect(x, s.top, s.right - x, s.bottom - s.top);
  }
  paintRounds(s);
  ctx.strokeStyle = HAIR;
  ctx.lineWidth = 1;
  ctx.beginPath();
  for (let row = s.firstRow; row <= last; row++) {
    const y = Math.round(yOf(s, row)) + 0.5;
    ctx.moveTo(0, y);
    ctx.lineTo(s.right, y);
  }
  ctx.stroke();
}

function paintRounds(s) {
  const length = given.round_s, { ctx } = s;
  if (!length || ((s.right - s.left) * length) / (s.to - s.from) < 6) return;
  ctx.save();
  ctx.strokeStyle = "#b9c2cb";
  ctx.setLineDash([2, 3]);
  ctx.beginPath();
  for (let at = Math.ceil(Math.max(0, s.from) / length) * length; at < Math.min(s.to, given.horizon_s); at += length) {
    const x = Math.round(xOf(s, at)) + 0.5;
    ctx.moveTo(x, s.top + s.head);
    ctx.lineTo(x, s.bottom);
  }
  ctx.stroke();
  ctx.restore();
}

// Closures lie over the bars: a bar that shows through is work that pauses.
function paintClosures(s) {
  const { ctx } = s;
  for (const shut of given.closures) {
    if (shut.end_s <= s.from || shut.start_s >= s.to) continue;
    const [y, height] = closedRows(s, shut.row);
    if (height <= 0) continue;
    const x = Math.max(s.left, xOf(s, shut.start_s)), width = Math.min(s.right, xOf(s, shut.end_s)) - x;
    ctx.fillStyle = "rgba(255,255,255,0.66)";
    ctx.fillRect(x, y, width, height);
    ctx.fillStyle = pattern(s, "cross", SHUT);
    ctx.fillRect(x, y, width, height);
    paintReason(s, oneLine(shut.reason), x, y, width, height);
  }
}

function closedRows(s, row) {
  const first = yOf(s, s.firstRow), bottom = s.bottom;
  if (row === null) return [first, bottom - first];
  for (let place = s.firstRow; place < lastRow(s); place++) {
    if (s.rows.machine(place) === row) return [yOf(s, place) + 1, s.rowHeight - 1];
  }
  return [0, 0];
}

function paintReason(s, text, x, y, width, height) {
  const { ctx } = s;
  ctx.save();
  ctx.font = `600 12px ${FONT}`;
  ctx.textAlign = "center";
  ctx.textBaseline = "middle";
  const upright = width < textWidth(ctx, text) + 10;
  const shown = fitted(ctx, text, (upright ? height : width) - 8), room = textWidth(ctx, shown) + 8;
  if (shown.length > 1 && Math.min(width, height) >= 14) {
    ctx.translate(x + width / 2, y + (upright ? Math.min(height / 2, room / 2 + 6) : Math.min(height / 2, 16)));
    if (upright) ctx.rotate(-Math.PI / 2);
    ctx.fillStyle = PAPER;
    ctx.fillRect(-room / 2, -8, room, 16);
    ctx.fillStyle = INK;
    ctx.fillText(shown, 0, 0.5);
  }
  ctx.restore();
}

// Changeovers are lower than runs, hollow and striped: setup is not work on an order.
function paintChangeovers(s) {
  const { ctx } = s;
  for (const change of given.changeovers) {
    if (change.end_s <= s.from || change.start_s >= s.to) continue;
    const [y, height] = closedRows(s, change.row);
    if (height <= 0) continue;
    const x = Math.max(s.left, xOf(s, change.start_s)), width = Math.min(s.right, xOf(s, change.end_s)) - x;
    const low = height * 0.45, top = y + height - low - 3;
    ctx.fillStyle = PAPER;
    ctx.fillRect(x, top, width, low);
    ctx.fillStyle = pattern(s, "back-stripes", QUIET);
    ctx.fillRect(x, top, width, low);
    ctx.strokeStyle = INK;
    ctx.lineWidth = 1;
    ctx.strokeRect(x + 0.5, top + 0.5, Math.max(0, width - 1), low - 1);
  }
}

// ---- names of the rows --------------------------------------------------------------------------

function paintNames(s) {
  const { ctx } = s, last = lastRow(s);
  const size = Math.max(13, Math.min(17, Math.floor(s.rowHeight * 0.42)));
  ctx.textBaseline = "middle";
  for (let row = s.firstRow; row < last; row++) {
    const y = yOf(s, row), middle = y + s.rowHeight / 2 + 0.5, binds = s.rows.binds(row);
    let room = s.left - 16;
    if (binds) {
      ctx.fillStyle = INK;
      ctx.fillRect(0, y + 1, s.left - 1, s.rowHeight - 1);
      ctx.fillStyle = PAPER;
      ctx.font = `12px ${FONT}`;
      ctx.textAlign = "right";
      ctx.fillText("binds", s.left - 8, middle);
      room -= textWidth(ctx, "binds") + 8;
    }
    ctx.font = `600 ${size}px ${FONT}`;
    ctx.textAlign = "left";
    ctx.fillStyle = binds ? PAPER : INK;
    ctx.fillText(fitted(ctx, s.rows.label(row), room), 8, middle);
  }
  ctx.fillStyle = INK;
  ctx.fillRect(s.left - 1, s.top, 1, s.bottom - s.top);
}

// In rows of orders: a flag at the due time.
function paintDues(s) {
  for (let row = s.firstRow; row < lastRow(s); row++) {
    const due = s.rows.due(row);
    if (due >= Math.max(0, s.from) && due <= s.to) paintFlag(s.ctx, xOf(s, due), yOf(s, row) + 2, s.rowHeight - 4);
  }
}

function paintFlag(ctx, x, y, height) {
  ctx.beginPath();
  ctx.rect(x - 1, y, 2, height);
  ctx.moveTo(x + 1, y);
  ctx.lineTo(x + 9, y + 4);
  ctx.lineTo(x + 1, y + 8);
  ctx.strokeStyle = PAPER;
  ctx.lineWidth = 2;
  ctx.stroke();
  ctx.fillStyle = "#000000";
  ctx.fill();
}

// Under the chart: which part of the whole plan is in the window.
function paintTrack(s) {
  const { ctx } = s, whole = { ...s, from: 0, to: given.horizon_s };
  if (s.from <= 0 && s.to >= given.horizon_s) return;
  ctx.fillStyle = HAIR;
  ctx.fillRect(s.left, s.bottom + 6, s.right - s.left, 4);
  const from = Math.max(s.left, xOf(whole, s.from)), to = Math.min(s.right, xOf(whole, s.to));
  ctx.fillStyle = QUIET;
  ctx.fillRect(from, s.bottom + 5, Math.max(6, to - from), 6);
}

// ---- lines: finish, bound, the shift's end, now -------------------------------------------------

const LINES = {
  proved: { width: 3, dash: [], colour: "#000000" },
  finish: { width: 3, dash: [], colour: "#000000" },
  bound: { width: 2, dash: [9, 4], colour: "#000000" },
  shift: { width: 2, dash: [2, 3], colour: QUIET },
  now: { width: 2, dash: [], colour: "#9c3412" },
};
const HEAD_ROW = 20;

// Each line has its own level in the head of the frame, so labels never meet.
function paintLines(s, lines) {
  const { ctx } = s;
  for (const line of lines) {
    if (line.at_s < s.from || line.at_s > s.to) continue;
    const look = LINES[line.kind], x = xOf(s, line.at_s);
    ctx.save();
    ctx.strokeStyle = look.colour;
    ctx.lineWidth = look.width;
    ctx.setLineDash(look.dash);
    ctx.beginPath();
    ctx.moveTo(x, s.top);
    ctx.lineTo(x, s.bottom);
    ctx.stroke();
    ctx.restore();
  }
  lines.forEach((line, level) => paintLineLabel(s, line, s.top + 2 + level * HEAD_ROW));
}

function paintLineLabel(s, line, y) {
  const { ctx } = s, x = xOf(s, line.at_s), frame = s.right - s.left - 16;
  const away = line.at_s > s.to ? " →" : line.at_s < s.from ? "← " : "";
  ctx.font = `600 13px ${FONT}`;
  ctx.textBaseline = "middle";
  const room = away ? frame : Math.max(x - s.left, s.right - x) - 16;
  let text = [line.text, line.short].map(oneLine).find((choice) => textWidth(ctx, choice) <= room);
  text ??= fitted(ctx, oneLine(line.short), frame);
  if (away === " →") text += away;
  else if (away) text = away + text;
  const width = textWidth(ctx, text);
  let left = x - width - 8; // before the line where there is room, else behind it, and always inside
  if (left < s.left + 4) left = x + 8;
  left = Math.max(s.left + 6, Math.min(left, s.right - width - 6));
  ctx.fillStyle = "rgba(255,255,255,0.9)";
  ctx.fillRect(left - 3, y, width + 6, HEAD_ROW - 3);
  ctx.fillStyle = LINES[line.kind].colour;
  ctx.textAlign = "left";
  ctx.fillText(text, left, y + (HEAD_ROW - 3) / 2 + 0.5);
}
