// Words beside the chart: details of a bar, the route of an order, search, legend, the table.
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
  if (due < 0) return "no due time";
  if (finish > due) return `due ${say(due)}, late by ${duration(finish - due)}`;
  return finish === due ? `due ${say(due)}, to the minute` : `due ${say(due)}, ${duration(due - finish)} to spare`;
}

// ---- details of one bar -------------------------------------------------------------------------

// How long a bar is worked on: closures that it spans are no work.
function workText(bar) {
  const start = bars.start[bar], end = bars.end[bar];
  let shut = 0;
  for (const closed of given.closures) {
    const here = closed.row === null || closed.row === bars.row[bar];
    if (here) shut += Math.max(0, Math.min(end, closed.end_s) - Math.max(start, closed.start_s));
  }
  return shut ? `${duration(end - start - shut)} of work, ${duration(shut)} closed` : duration(end - start);
}

function detailLines(bar) {
  const order = bars.order[bar], machine = machines[bars.row[bar]];
  const name = machine.name && machine.name !== machine.machine ? ` (${oneLine(machine.name)})` : "";
  const found = [
    `${oneLine(machine.label)}${name}`,
    `${span(bars.start[bar], bars.end[bar])}, ${workText(bar)}`,
    `order ends ${say(orders.finish[order])}, ${standing(order)}`,
  ];
  if (orders.release[order] > 0) found.push(`not before ${say(orders.release[order])}`);
  const pieces = [];
  if (bars.round[bar]) pieces.push(`round ${bars.round[bar]}`);
  if (bars.parts[bar] > 1) pieces.push(`part ${bars.part[bar]} of ${bars.parts[bar]}`);
  if (pieces.length) found.push(pieces.join(", "));
  const note = bars.notes.get(bar);
  if (note) found.push(`note: ${oneLine(note)}`);
  return found;
}

function showTip(bar, x, y) {
  if (bar < 0) {
    tip.hidden = true;
    return;
  }
  const shown = detailLines(bar);
  while (tip.children.length < shown.length + 1) tip.append(element("p"));
  while (tip.children.length > shown.length + 1) tip.lastElementChild.remove();
  tip.children[0].textContent = oneLine(orders.ids[bars.order[bar]]);
  shown.forEach((line, i) => (tip.children[i + 1].textContent = line));
  tip.hidden = false;
  const { offsetWidth: width, offsetHeight: height } = tip, edge = 8;
  const left = x + 16 + width + edge > innerWidth ? x - 16 - width : x + 16;
  const top = y + 18 + height + edge > innerHeight ? y - 12 - height : y + 18;
  tip.style.transform = `translate(${Math.max(edge, left)}px, ${Math.max(edge, top)}px)`;
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
    const part = bars.parts[bar] > 1 ? `part ${bars.part[bar]} of ${bars.parts[bar]}` : "";
    const extra = [part, bars.notes.get(bar) ? oneLine(bars.notes.get(bar)) : ""].filter(Boolean).join(", ");
    if (extra) item.append(element("small", extra));
    route.append(item);
  }
}

function sayBar(bar) {
  said.textContent = `${named(orders.ids[bars.order[bar]])}: ${detailLines(bar).join("; ")}`;
}

// ---- search and filter --------------------------------------------------------------------------

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
      : "No order or note holds this text.";
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
  byId("due-key").hidden = kind !== "orders" || byId("late-only").hidden;
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
  answer.textContent = late ? `${count(late, "order")} late.` : "No order is late.";
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

function buildLegend() {
  const used = new Set(bars.group), legend = byId("legend");
  const add = (text, draw) => {
    const item = element("li");
    item.append(legendKey(draw), element("span", text));
    legend.append(item);
  };
  groups.forEach((group, index) => {
    if (used.has(index)) add(group.name, (s) => fillAs(s, group, 0, 0, 34, 18));
  });
  const striped = (kind, colour) => (s) => {
    s.ctx.fillStyle = pattern(s, kind, colour);
    s.ctx.fillRect(0, 0, 34, 18);
  };
  if (given.closures.length) add("closed", striped("cross", SHUT));
  if (given.changeovers.length) add("changeover", striped("back-stripes", QUIET));
  add("due", (s) => paintFlag(s.ctx, 13, 2, 14));
  legend.lastElementChild.id = "due-key";
  legend.lastElementChild.hidden = true;
}

// ---- the table ----------------------------------------------------------------------------------

const PAGE = 500;
let tablePage = 0;

function tableRow(bar) {
  const machine = machines[bars.row[bar]], order = bars.order[bar], due = orders.due[order];
  return [
    say(bars.start[bar]), say(bars.end[bar]), machine.machine, machine.unit || "",
    orders.ids[order], bars.round[bar] || "",
    bars.parts[bar] > 1 ? `${bars.part[bar]} of ${bars.parts[bar]}` : "",
    due < 0 ? "" : say(due), groups[bars.group[bar]].name, bars.notes.get(bar) ?? "",
  ];
}

function fillTable() {
  const first = tablePage * PAGE, last = Math.min(first + PAGE, bars.size);
  const body = element("tbody");
  for (let bar = first; bar < last; bar++) {
    const row = element("tr");
    for (const cell of tableRow(bar)) row.append(element("td", cell));
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
