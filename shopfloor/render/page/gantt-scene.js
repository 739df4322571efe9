// What stands around the bars: ground, names of rows, lines with their labels.

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
    ctx.lineTo(x, s.rowsBottom);
  }
  ctx.stroke();
  ctx.restore();
}

// ---- names of the rows --------------------------------------------------------------------------

function paintNames(s) {
  const { ctx } = s, last = lastRow(s);
  const size = Math.max(13, Math.min(17, Math.floor(s.rowHeight * 0.42)));
  for (let row = s.firstRow; row < last; row++) {
    paintName(s, s.rows.label(row), s.rows.binds(row), yOf(s, row) + 1, s.rowHeight - 1, size);
  }
  ctx.fillStyle = INK;
  ctx.fillRect(s.left - 1, s.top, 1, s.rowsBottom - s.top);
}

function paintName(s, name, binds, y, height, size) {
  const { ctx } = s, middle = y + height / 2;
  let room = s.left - 16;
  ctx.textBaseline = "middle";
  if (binds) {
    ctx.fillStyle = INK;
    ctx.fillRect(0, y, s.left - 1, height);
    ctx.fillStyle = PAPER;
    ctx.font = `12px ${FONT}`;
    ctx.textAlign = "right";
    ctx.fillText("binds", s.left - 8, middle);
    room -= textWidth(ctx, "binds") + 8;
  }
  ctx.font = `600 ${size}px ${FONT}`;
  ctx.textAlign = "left";
  ctx.fillStyle = binds ? PAPER : INK;
  ctx.fillText(fitted(ctx, oneLine(name), room), 8, middle);
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
