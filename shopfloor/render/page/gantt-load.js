// How busy each machine is, in place of bars, where the window holds more of them than anybody can tell
// apart; and beyond the last bar that the page has.

const READABLE = 4000; // bars in sight
const BLOCK = 4; // pixels, at least
const BUSY = "#5d88ad", FREE = "#e9eef2";

function barsInSight(s) {
  let found = 0;
  for (let row = s.firstRow; row < lastRow(s); row++) {
    const list = s.rows.lists.of(row);
    found += firstEndingAfter(list, s.to) - firstEndingAfter(list, s.from);
  }
  return found;
}

function loadShown(s) {
  return load !== null && s.rows.kind === "machines" && barsInSight(s) > READABLE;
}

// Share of the time between two steps that a row is busy.
function shareBusy(row, first, last) {
  let sum = 0;
  for (let step = first; step < last; step++) sum += load.share[row * load.steps + step] / 31;
  return sum / (last - first);
}

// From `from` on: a block for every few pixels, as high as the row is busy.
function paintLoad(s, from) {
  const { ctx } = s, pad = s.rowHeight > 26 ? 4 : 2, tall = s.rowHeight - 2 * pad;
  const perStep = ((s.right - s.left) * load.step_s) / (s.to - s.from), group = Math.ceil(BLOCK / perStep);
  const begin = Math.max(0, Math.floor(from / load.step_s / group) * group);
  const end = Math.min(load.steps, Math.ceil(s.to / load.step_s));
  for (let row = s.firstRow; row < lastRow(s); row++) {
    const y = yOf(s, row) + pad;
    for (let step = begin; step < end; step += group) {
      const last = Math.min(step + group, load.steps);
      const [x, width] = snapped(s, Math.max(from, step * load.step_s), last * load.step_s);
      const busy = Math.round(shareBusy(row, step, last) * tall);
      ctx.fillStyle = FREE;
      ctx.fillRect(x, y, width, tall - busy);
      ctx.fillStyle = BUSY;
      ctx.fillRect(x, y + tall - busy, width, busy);
    }
  }
}

function loadThing(row, time) {
  const step = Math.floor(time / load.step_s);
  if (step < 0 || step >= load.steps) return null;
  const from = step * load.step_s, to = from + load.step_s, list = state.rows.lists.of(row);
  const lines = [`${span(from, to)}: busy about ${Math.round(shareBusy(row, step, step + 1) * 100)}% of the time`];
  if (to <= given.detail_s) {
    const size = firstEndingAfter(list, to) - firstEndingAfter(list, from) + 1;
    lines.push(`about ${count(size, "operation")}; show less time to see them`);
  }
  return { title: oneLine(machines[row].label), lines };
}

// One sentence on how the window is drawn; on pages that hold every bar and draw them all there is none.
function loadText() {
  if (!load) return "";
  const s = { ...box, from: state.from, to: state.to, firstRow: state.firstRow };
  if (loadShown(s)) {
    const height = "the height of a block is the share of that time a machine is busy";
    return `Drawn as load: ${height}. Show less time (+) for single operations.`;
  }
  if (state.rows.kind !== "machines") return "";
  return `Drawn in detail: ${span(...shownMinutes())}. More time at once is drawn as load by machine.`;
}
