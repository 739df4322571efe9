// Words beside the chart: the route of an order, search, legend, the table.
// Every name is written with textContent; nothing here reads markup.

const tip = byId("tip"), answer = byId("answer"), said = byId("said"), route = byId("route");
const finder = byId("find");

function element(tag, text, className) {
  const made = document.createElement(tag);
  if (text !== undefined) made.textContent = text;
  if (className) made.className = className;
  return made;
}

function standing(order) {
  const due = orders.due[order], finish = orders.finish[order];
  if (due === Infinity) return "no due time";
  if (finish > due) return `due ${say(due)}, late by ${duration(finish - due)}`;
  return finish === due ? `due ${say(due)}, to the minute` : `due ${say(due)}, ${duration(due - finish)} to spare`;
}

// ---- one order lit in every row -----------------------------------------------------------------

const HINT = answer.textContent;

function light(order) {
  state.lit = order;
  repaintMarks();
  route.replaceChildren();
  if (order < 0) {
    answer.textContent = HINT;
    return;
  }
  const visits = barsOfOrder.of(order);
  answer.textContent =
    `${named(orders.ids[order])} is lit: ${count(visits.length, "operation")}, ` +
    `ends ${say(orders.finish[order])}, ${standing(order)}.`;
  for (const bar of visits) {
    const item = element("li"), machine = machines[bars.row[bar]];
    item.append(element("time", span(bars.start[bar], bars.end[bar])), element("b", oneLine(machine.label)));
    const note = bars.notes.get(bar) ? oneLine(bars.notes.get(bar)) : "";
    const extra = [partText(bar), setUpText(bar), note].filter(Boolean).join(", ");
    if (extra) item.append(element("small", extra));
    route.append(item);
    if (bars.way[bar]) route.append(element("li", wayText(bar), "way"));
  }
  if (route.scrollHeight > route.clientHeight) route.tabIndex = 0; // so that keys can scroll it
  else route.removeAttribute("tabindex");
}

// ---- search and filter --------------------------------------------------------------------------

const onThisPage = given.detail_s < given.horizon_s ? " on this page" : "";
let foundOrders = [];

function search() {
  const wanted = finder.value.trim().toLowerCase();
  foundOrders = [];
  state.matches = null;
  if (wanted) {
    const matches = new Uint8Array(orders.size);
    orders.ids.forEach((id, order) => {
      if (id.toLowerCase().includes(wanted)) matches[order] = 1;
    });
    for (const [bar, note] of bars.notes) if (note.toLowerCase().includes(wanted)) matches[bars.order[bar]] = 1;
    state.matches = matches;
    for (let order = 0; order < orders.size; order++) {
      if (matches[order] && barsOfOrder.of(order).length) foundOrders.push(order);
    }
    foundOrders.sort((a, b) => orders.first[a] - orders.first[b] || a - b);
  }
  const one = foundOrders.length === 1;
  if (one) lightAndShow(foundOrders[0]);
  else light(-1);
  if (wanted && !one) {
    answer.textContent = foundOrders.length
      ? `${count(foundOrders.length, "order")} found. Enter lights them one after the other.`
      : `No order or note${onThisPage} holds this text.`;
  }
}

function lightAndShow(order) {
  if (state.lateOnly && !isLate(order)) setLateOnly(false);
  light(order);
  const visits = barsOfOrder.of(order);
  const inWindow = (bar) => bars.start[bar] < state.to && bars.end[bar] > state.from;
  bringIntoSight(visits.find(inWindow) ?? visits[0]);
}

function lightNextFound() {
  if (!foundOrders.length) return;
  lightAndShow(foundOrders[(foundOrders.indexOf(state.lit) + 1) % foundOrders.length]);
}

function setRows(kind) {
  const keep = (order) => !state.lateOnly || isLate(order);
  state.rows = kind === "orders" ? orderRows(keep) : machineRows();
  state.firstRow = 0;
  state.hover = -1;
  showTip(-1);
  byId("as-orders").setAttribute("aria-pressed", String(kind === "orders"));
  showDueKey();
  relay();
  const anchor = state.focus >= 0 ? state.focus : state.lit >= 0 ? barsOfOrder.of(state.lit)[0] : -1;
  if (anchor >= 0 && state.rows.rowOf(anchor) >= 0) {
    const row = state.rows.rowOf(anchor);
    if (row >= box.shownRows) setFirstRow(row - (box.shownRows >> 1));
  } else if (kind === "orders") {
    setFirstRow(firstRowAtWork());
  }
}

// In rows of orders: the first order whose work reaches into the window, so that it does not look empty.
function firstRowAtWork() {
  const { lists } = state.rows;
  for (let row = 0; row < lists.size; row++) {
    const list = lists.of(row);
    if (bars.end[list[list.length - 1]] > state.from) return row;
  }
  return 0;
}

function setLateOnly(on) {
  state.lateOnly = on;
  byId("late-only").setAttribute("aria-pressed", String(on));
  if (state.rows.kind === "orders") setRows("orders");
  else repaintMarks();
  if (!on) return;
  let late = 0;
  for (let order = 0; order < orders.size; order++) if (isLate(order)) late++;
  answer.textContent = late ? `${count(late, "order")} late${onThisPage}.` : `No order is late${onThisPage}.`;
}

// ---- legend -------------------------------------------------------------------------------------

function legendKey(draw) {
  const canvas = element("canvas"), scale = 3;
  canvas.width = 34 * scale;
  canvas.height = 18 * scale;
  const ctx = canvas.getContext("2d");
  ctx.scale(scale, scale);
  draw({ ctx, scale });
  ctx.strokeStyle = "rgba(16,32,47,0.6)";
  ctx.strokeRect(0.5, 0.5, 33, 17);
  return canvas;
}

function striped(kind, colour) {
  return (s) => {
    s.ctx.fillStyle = pattern(s, kind, colour);
    s.ctx.fillRect(0, 0, 34, 18);
  };
}

function setUpKey(s) {
  s.ctx.fillStyle = PAPER;
  s.ctx.fillRect(0, 0, 34, 18);
  striped("cross", QUIET)(s);
  s.ctx.fillStyle = PAPER;
  s.ctx.fillRect(18, 0, 16, 18);
  s.ctx.fillStyle = INK;
  s.ctx.fillRect(17, 0, 1, 18);
}

function idleKey({ ctx }) {
  ctx.strokeStyle = QUIET;
  ctx.setLineDash([3, 3]);
  ctx.strokeRect(4.5, 4.5, 25, 9);
  ctx.setLineDash([]);
}

function crewKey({ ctx }) {
  ctx.fillStyle = USED;
  ctx.fillRect(0, 9, 17, 9);
  ctx.fillStyle = ALL_USED;
  ctx.fillRect(17, 5, 17, 13);
  ctx.fillStyle = "#000000";
  ctx.fillRect(0, 4, 34, 2);
}

function buildLegend() {
  const legend = byId("legend"), shown = state.byFamily ? familyGroups : groups;
  const used = new Set(state.byFamily ? bars.family.map((family) => families[family].group) : bars.group);
  legend.replaceChildren();
  const add = (text, draw) => {
    const item = element("li");
    item.append(legendKey(draw), element("span", text));
    legend.append(item);
  };
  shown.forEach((group, index) => {
    if (used.has(index)) add(oneLine(group.name), (s) => fillAs(s, group, 0, 0, 34, 18));
  });
  if (state.byFamily && orders.due.some((due, order) => isLate(order))) {
    add("late", (s) => paintLate(s, { x: 0, y: 0, width: 34, height: 18 }));
  }
  if (bars.setUpEnd.some((end, bar) => end > bars.start[bar])) add("set-up", setUpKey);
  if (changes.size) add("changeover", striped("back-stripes", QUIET));
  if (closures.length) add("closed", striped("cross", SHUT));
  if (given.gaps.length) add("idle where it binds", idleKey);
  if (crews.length) add("heads at work; dark: all", crewKey);
  add("due", (s) => paintFlag(s.ctx, 13, 2, 14));
  legend.lastElementChild.id = "due-key";
  showDueKey();
}

function showDueKey() {
  byId("due-key").hidden = state.rows.kind !== "orders" || byId("late-only").hidden;
}

function setByFamily(on) {
  state.byFamily = on;
  byId("by-family").setAttribute("aria-pressed", String(on));
  buildLegend();
  relay();
}

// ---- the table ----------------------------------------------------------------------------------

const PAGE = 500;
let tablePage = 0;

// A title and what stands under it; the floor's own columns only where the plan has what they tell.
const COLUMNS = [
  ["Start", (bar) => say(bars.start[bar])],
  ["End", (bar) => say(bars.end[bar])],
  ["Machine", (bar) => machines[bars.row[bar]].machine],
  ["Unit", (bar) => machines[bars.row[bar]].unit || ""],
  ["Order", (bar) => orders.ids[bars.order[bar]]],
  ["Round", (bar) => bars.round[bar] || ""],
  ["Part", (bar) => (bars.parts[bar] > 1 ? `${bars.part[bar]} of ${bars.parts[bar]}` : "")],
  ["Set-up to", (bar) => (bars.setUpEnd[bar] > bars.start[bar] ? say(bars.setUpEnd[bar]) : ""), "optional"],
  ["Closed", (bar) => (bars.paused[bar] ? duration(bars.paused[bar]) : ""), "optional"],
  ["Family", (bar) => (families.length ? families[bars.family[bar]].name : ""), "optional"],
  ["Changeover before", (bar) => (changes.of.has(bar) ? changeText(changes.of.get(bar)) : ""), "optional"],
  ["Heads", (bar) => bars.heads[bar] || "", "optional"],
  ["On the way after", (bar) => (bars.way[bar] ? duration(bars.way[bar]) : ""), "optional"],
  ["Due", (bar) => (orders.due[bars.order[bar]] === Infinity ? "" : say(orders.due[bars.order[bar]]))],
  ["Standing", (bar) => groups[bars.group[bar]].name],
  ["Note", (bar) => bars.notes.get(bar) ?? ""],
];

function anyBar(cell) {
  for (let bar = 0; bar < bars.size; bar++) if (cell(bar)) return true;
  return false;
}

let columns = null;

function buildTableHead() {
  columns = COLUMNS.filter(([, cell, optional]) => !optional || anyBar(cell));
  const row = byId("table").querySelector("thead tr");
  for (const [title] of columns) row.append(element("th", title));
  for (const head of row.children) head.scope = "col";
}

function fillTable() {
  if (!columns) buildTableHead();
  const first = tablePage * PAGE, last = Math.min(first + PAGE, bars.size);
  const body = element("tbody");
  for (let bar = first; bar < last; bar++) {
    const row = element("tr");
    for (const [, cell] of columns) row.append(element("td", cell(bar)));
    body.append(row);
  }
  byId("table").querySelector("tbody").replaceWith(body);
  byId("table").querySelector("caption").textContent = bars.size
    ? `Operations ${first + 1} to ${last} of ${bars.size}, by start`
    : "No operations";
  byId("table-before").disabled = first === 0;
  byId("table-after").disabled = last >= bars.size;
}

function turnTable(by) {
  tablePage += by;
  fillTable();
}
