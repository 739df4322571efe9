// Paper: before printing, the chart is drawn anew at print resolution on as many sheets as its rows
// need. All of it happens while the browser waits, for it does not wait again.

const SHEET = { width: 975, height: 700, scale: 3 }; // CSS pixels that A4 and Letter landscape both hold
const BESIDE = 62; // what a sheet holds beside its chart: a line above, the care notice below
const PRINT_ROW = 22, PRINT_SHEETS = 12, PRINT_TEXT = 10;

function paintSheetAxis(s) {
  const { ctx } = s;
  ctx.strokeStyle = "#dfe5ea";
  ctx.fillStyle = INK;
  ctx.font = `15px ${FONT}`;
  ctx.textAlign = "center";
  ctx.textBaseline = "middle";
  ctx.lineWidth = 1;
  for (const tick of ticks(s.from, s.to, ((s.to - s.from) / (s.right - s.left)) * 78)) {
    const x = Math.round(xOf(s, tick.at)) + 0.5;
    ctx.beginPath();
    ctx.moveTo(x, s.top - 5);
    ctx.lineTo(x, s.bottom);
    ctx.stroke();
    ctx.fillText(tick.text, x, s.top - 14);
  }
  ctx.fillRect(s.left, s.top - 1, s.right - s.left, 1);
}

function paintSheet(firstRow, height) {
  const canvas = element("canvas"), { width, scale } = SHEET;
  canvas.width = width * scale;
  canvas.height = Math.round(height * scale);
  const ctx = canvas.getContext("2d");
  ctx.scale(scale, scale);
  const s = sheetGeometry(firstRow, height);
  paintSheetAxis({ ...s, ctx });
  paintLower({ ...s, ctx });
  const { hover, focus } = state;
  Object.assign(state, { hover: -1, focus: -1 }); // paper has no pointer
  paintUpper({ ...s, ctx });
  Object.assign(state, { hover, focus });
  canvas.style.width = `${width}px`;
  canvas.style.height = `${height}px`;
  return [canvas, firstRow + s.shownRows];
}

function sheetGeometry(firstRow, height) {
  const size = state.rows.lists.size, head = lines().length * HEAD_ROW + 4;
  const room = height - AXIS - head - crewRoom() - FOOT;
  const shownRows = Math.max(1, Math.min(size - firstRow, Math.floor(room / PRINT_ROW)));
  const rowHeight = Math.min(HIGHEST_ROW, room / shownRows);
  return {
    scale: SHEET.scale, width: SHEET.width, height, small: PRINT_TEXT,
    rows: state.rows, head, shownRows, rowHeight, firstRow, from: state.from, to: state.to,
    left: box.left, right: SHEET.width - 8,
    top: AXIS, rowsBottom: AXIS + head + shownRows * rowHeight,
    bottom: AXIS + head + shownRows * rowHeight + crewRoom(),
  };
}

function buildSheets() {
  dropSheets();
  document.documentElement.classList.add("printing");
  byId("lit").classList.toggle("dark", state.lit < 0);
  const sheets = byId("sheets"), care = document.querySelector(".care"), size = state.rows.lists.size;
  const used = sheets.getBoundingClientRect().top - document.body.getBoundingClientRect().top;
  let row = 0, height = Math.max(200, Math.round(SHEET.height - used - BESIDE));
  for (let sheet = 0; sheet < PRINT_SHEETS && (row < size || sheet === 0); sheet++) {
    const [canvas, next] = paintSheet(row, height);
    const part = element("section", undefined, "sheet");
    const cut = sheet === PRINT_SHEETS - 1 && next < size;
    const rest = cut ? `; ${count(size - next, "more row")} not printed` : "";
    part.append(element("p", windowText() + rest, "sheet-title"), canvas, care.cloneNode(true));
    sheets.append(part);
    row = next;
    height = SHEET.height - BESIDE;
  }
}

function windowText() {
  const [from, to] = shownMinutes(), whole = from === 0 && to === toMinute(given.horizon_s);
  return whole ? "" : `${span(from, to)} of a plan to ${say(given.horizon_s)}`;
}

function dropSheets() {
  document.documentElement.classList.remove("printing");
  byId("sheets").replaceChildren();
}

addEventListener("beforeprint", buildSheets);
addEventListener("afterprint", dropSheets);
