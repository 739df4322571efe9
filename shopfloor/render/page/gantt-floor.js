// What the floor's rules put beside the bars: closures, changeovers, idle time, ways, and a row for each crew.

const CREW_HEIGHT = 38, CREW_GAP = 6;
const USED = "#a9b6c2", ALL_USED = "#4b5965";

// Closures lie over the bars: a bar that shows through is work that pauses.
function paintClosures(s) {
  const { ctx } = s;
  for (const shut of closures) {
    if (shut.end_s <= s.from || shut.start_s >= s.to) continue;
    const [y, height] = closedRows(s, shut.row);
    if (height <= 0) continue;
    const [x, width] = across(s, shut.start_s, shut.end_s);
    ctx.fillStyle = "rgba(255,255,255,0.66)";
    ctx.fillRect(x, y, width, height);
    ctx.fillStyle = pattern(s, "cross", SHUT);
    ctx.fillRect(x, y, width, height);
  }
  for (const shut of closures) paintReason(s, shut);
}

// Where a stretch of time lies, as far as it is in the window.
function across(s, start, end) {
  const x = Math.max(s.left, xOf(s, start));
  return [x, Math.min(s.right, xOf(s, end)) - x];
}

// The same from pixel to pixel, so that neighbours leave no seam.
function snapped(s, start, end) {
  const [x, width] = across(s, start, end), left = Math.round(x * s.scale) / s.scale;
  return [left, Math.max(0, Math.round((x + width) * s.scale) / s.scale - left)];
}

function closedRows(s, row) {
  const first = yOf(s, s.firstRow);
  if (row === null) return [first, s.rowsBottom - first];
  const place = s.rows.placeOf(row);
  if (place < s.firstRow || place >= lastRow(s)) return [0, 0];
  return [yOf(s, place) + 1, s.rowHeight - 1];
}

// The name of a closure: across where that fits, else upright; for the hall's breaks at the top, where no
// machine's own closure has its name.
function paintReason(s, shut) {
  if (shut.end_s <= s.from || shut.start_s >= s.to) return;
  const [y, height] = closedRows(s, shut.row), [x, width] = across(s, shut.start_s, shut.end_s);
  if (height <= 0) return;
  const { ctx } = s, text = oneLine(shut.reason);
  ctx.save();
  ctx.font = `600 12px ${FONT}`;
  ctx.textAlign = "center";
  ctx.textBaseline = "middle";
  const hall = shut.row === null, upright = hall && width < textWidth(ctx, text) + 10;
  const shown = fitted(ctx, text, (upright ? height : width) - 8), room = textWidth(ctx, shown) + 8;
  const whole = shown === text || shown.length > 4;
  if (whole && Math.min(width, height) >= 14) {
    ctx.translate(x + width / 2, y + (upright ? room / 2 + 3 : Math.min(height / 2, hall ? 11 : height)));
    if (upright) ctx.rotate(-Math.PI / 2);
    ctx.fillStyle = PAPER;
    ctx.fillRect(-room / 2, -8, room, 16);
    ctx.fillStyle = INK;
    ctx.fillText(shown, 0, 0.5);
  }
  ctx.restore();
}

// Changeovers are lower than runs, hollow and striped: making ready for an order is not work on it.
function paintChangeovers(s) {
  const { ctx } = s;
  for (let i = 0; i < changes.size; i++) {
    if (changes.end[i] <= s.from || changes.start[i] >= s.to) continue;
    const [y, height] = closedRows(s, bars.row[changes.bar[i]]);
    if (height <= 0) continue;
    const [x, width] = across(s, changes.start[i], changes.end[i]);
    const low = Math.round(height * 0.5), top = y + height - low - 3;
    if (width < NARROW) {
      ctx.fillStyle = SHUT;
      ctx.fillRect(x, top, width, low);
      continue;
    }
    ctx.fillStyle = PAPER;
    ctx.fillRect(x, top, width, low);
    ctx.fillStyle = pattern(s, "back-stripes", QUIET);
    ctx.fillRect(x, top, width, low);
    ctx.strokeStyle = INK;
    ctx.lineWidth = 1;
    ctx.strokeRect(x + 0.5, top + 0.5, Math.max(0, width - 2), low - 1);
    const whole = changes.end[i] - changes.start[i] === changes.seconds[i]; // no closure lies in it
    if (whole) paintMinutes(s, changes.seconds[i], x, top, width - 1, low);
  }
}

// A length written into a box, where it fits with air around it.
function paintMinutes(s, seconds, x, y, width, height) {
  const { ctx } = s;
  const pixels = Math.min(12, height - 2);
  if (pixels < 9) return;
  ctx.font = `${pixels}px ${FONT}`;
  const text = [duration(seconds), `${Math.round(seconds / 60)}`].find((t) => textWidth(ctx, t) + 8 <= width);
  if (!text) return;
  const room = textWidth(ctx, text) + 5;
  ctx.fillStyle = PAPER;
  ctx.fillRect(x + width / 2 - room / 2, y + 1, room, height - 2);
  ctx.fillStyle = INK;
  ctx.textAlign = "center";
  ctx.textBaseline = "middle";
  ctx.fillText(text, x + width / 2, y + height / 2 + 0.5);
}

// Where the machine that binds stands idle, there is time to win.
function paintGaps(s) {
  const { ctx } = s;
  for (const gap of given.gaps) {
    if (gap.end_s <= s.from || gap.start_s >= s.to) continue;
    const [y, height] = closedRows(s, gap.row), [x, width] = across(s, gap.start_s, gap.end_s);
    if (height <= 0 || width < 2 * NARROW) continue;
    ctx.save();
    ctx.strokeStyle = QUIET;
    ctx.lineWidth = 1;
    ctx.setLineDash([3, 3]);
    ctx.strokeRect(x + 2.5, y + 4.5, width - 5, height - 9);
    ctx.restore();
    if (width > 40) paintMinutes(s, gap.seconds, x + 4, y + height / 2 - 8, width - 8, 16);
  }
}

// In rows of orders: how long the order is on its way to its next machine.
function paintWays(s, source) {
  if (s.rows.kind !== "orders") return;
  const { ctx } = s;
  ctx.strokeStyle = ctx.fillStyle = INK;
  ctx.lineWidth = 1.5;
  source((bar, row) => {
    if (!bars.way[bar]) return;
    const y = Math.round(yOf(s, row) + s.rowHeight / 2) + 0.5;
    const [x, width] = across(s, bars.end[bar], bars.end[bar] + bars.way[bar]);
    if (width < 3) return;
    ctx.beginPath();
    ctx.moveTo(x, y);
    ctx.lineTo(x + width, y);
    ctx.moveTo(x + width - 4, y - 3);
    ctx.lineTo(x + width, y);
    ctx.lineTo(x + width - 4, y + 3);
    ctx.stroke();
  });
}

// ---- crews: heads at work against heads there -----------------------------------------------------

function crewRoom() {
  return crews.length ? CREW_GAP + crews.length * CREW_HEIGHT : 0;
}

function crewTop(s, place) {
  return s.rowsBottom + CREW_GAP + place * CREW_HEIGHT;
}

function stepAt(crew, time) {
  let low = 0, high = crew.size - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (crew.at[middle] <= time) low = middle;
    else high = middle - 1;
  }
  return low;
}

// Call `each(x, width, step)` for every step in the window.
function stepsInSight(s, crew, each) {
  for (let i = stepAt(crew, s.from); i < crew.size - 1 && crew.at[i] < s.to; i++) {
    const [x, width] = snapped(s, crew.at[i], crew.at[i + 1]);
    if (width > 0) each(x, width, i);
  }
}

function paintCrews(s) {
  const { ctx } = s;
  crews.forEach((crew, place) => {
    const top = crewTop(s, place), foot = top + CREW_HEIGHT - 3, tall = CREW_HEIGHT - 3 - 15;
    const level = (heads) => foot - (crew.most ? (heads / crew.most) * tall : 0);
    ctx.fillStyle = HAIR;
    ctx.fillRect(0, top - 0.5, s.right, 1);
    stepsInSight(s, crew, (x, width, i) => {
      const used = crew.used[i];
      ctx.fillStyle = used && used >= crew.there[i] ? ALL_USED : USED;
      ctx.fillRect(x, level(used), width, foot - level(used));
    });
    paintHeadsThere(s, crew, level);
    ctx.fillStyle = INK;
    ctx.fillRect(s.left, foot, s.right - s.left, 1);
    paintName(s, crew.crew, crew.binds, top + 1, CREW_HEIGHT - 2, 13);
  });
  if (!crews.length) return;
  ctx.fillStyle = INK;
  ctx.fillRect(s.left - 1, s.rowsBottom, 1, s.bottom - s.rowsBottom);
}

// The limit is a line over the work, with its number wherever it begins or changes.
function paintHeadsThere(s, crew, level) {
  const { ctx } = s, stretches = [];
  stepsInSight(s, crew, (x, width, i) => {
    const last = stretches[stretches.length - 1];
    if (last && last.there === crew.there[i]) last.end = x + width;
    else stretches.push({ there: crew.there[i], start: x, end: x + width });
  });
  ctx.strokeStyle = "#000000";
  ctx.lineWidth = 2;
  ctx.beginPath();
  for (const { there, start, end } of stretches) {
    ctx.lineTo(start, level(there));
    ctx.lineTo(end, level(there));
  }
  ctx.stroke();
  ctx.font = `600 12px ${FONT}`;
  ctx.textAlign = "left";
  ctx.textBaseline = "bottom";
  for (const { there, start, end } of stretches) {
    const text = [count(there, "head"), `${there}`].find((t) => textWidth(ctx, t) + 6 <= end - start);
    if (!text) continue;
    ctx.fillStyle = INK;
    ctx.fillText(text, start + 3, level(there) - 1);
  }
}

// ---- what the pointer is on where there is no bar -------------------------------------------------

const inside = (thing, time) => thing.start_s <= time && time < thing.end_s;

// A title and lines about a closure, changeover, idle gap, crew or load under the pointer, or null.
function thingAt(s, x, y) {
  if (x < s.left || x > s.right || y < s.top + s.head || y > s.bottom) return null;
  const time = timeAt(x);
  if (y >= s.rowsBottom) return crewThing(Math.floor((y - crewTop(s, 0)) / CREW_HEIGHT), time);
  const row = s.firstRow + Math.floor((y - s.top - s.head) / s.rowHeight);
  return row < s.rows.lists.size ? rowThing(s, row, time) : null;
}

function crewThing(place, time) {
  const crew = crews[place];
  if (!crew || time < 0 || time > given.horizon_s) return null;
  const step = stepAt(crew, time);
  const used = `${crew.used[step]} of ${count(crew.there[step], "head")} at work`;
  return { title: `crew ${oneLine(crew.crew)}`, lines: [`${say(Math.round(time / 60) * 60)}: ${used}`] };
}

function rowThing(s, row, time) {
  const shut = closures.find((c) => inside(c, time) && (c.row === null || s.rows.placeOf(c.row) === row));
  if (s.rows.kind === "machines") {
    const busy = loadShown(s) || time >= given.detail_s ? loadThing(row, time) : null;
    if (busy) return busy;
    for (let i = 0; i < changes.size; i++) {
      const here = bars.row[changes.bar[i]] === row && changes.start[i] <= time && time < changes.end[i];
      if (here) return { title: "changeover", lines: [machines[row].label, changeText(i)].map(oneLine) };
    }
  }
  if (shut) {
    const where = shut.row === null ? "the whole hall" : oneLine(machines[shut.row].label);
    return { title: oneLine(shut.reason), lines: [`${where} is shut ${span(shut.start_s, shut.end_s)}`] };
  }
  const gap = s.rows.kind === "machines" && given.gaps.find((g) => g.row === row && inside(g, time));
  if (!gap) return null;
  const lines = [`${oneLine(machines[row].label)} could work ${span(gap.start_s, gap.end_s)}`];
  return { title: `${duration(gap.seconds)} idle`, lines };
}

function familyName(family) {
  return families[family].name ? named(families[family].name) : "no family";
}

function changeText(i) {
  const way = `${familyName(changes.before[i])} to ${familyName(bars.family[changes.bar[i]])}`;
  return `changeover from ${way}: ${duration(changes.seconds[i])}, ${span(changes.start[i], changes.end[i])}`;
}
