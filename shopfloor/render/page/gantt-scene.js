// What stands around the bars: ground, closures and changeovers, names of rows, lines with their labels.

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
  const { ctx } = s, starts = given.rounds_s;
  if (!starts.length || ((s.right - s.left) * given.horizon_s) / (s.to - s.from) / starts.length < 6) return;
  ctx.save();
  ctx.strokeStyle = "#b9c2cb";
  ctx.setLineDash([2, 3]);
  ctx.beginPath();
  for (const at of starts) {
    if (at <= s.from || at >= s.to) continue;
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
