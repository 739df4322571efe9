// What the page was given: columns unpacked, and the few sums that drawing needs.
// Times are whole seconds since the shift's start. A "bar" and an "order" are indices into columns.

const given = JSON.parse(document.getElementById("plan-data").textContent);

const DIGITS = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz-_";
const DIGIT_OF = new Uint8Array(128);
for (let digit = 0; digit < 64; digit++) DIGIT_OF[DIGITS.charCodeAt(digit)] = digit;

// The inverse of `pack` in gantt.py: base 32, least digit first, 32 added to each digit that is not
// the last of its number. A column of equal values comes as that one number.
function unpack(column, size) {
  const values = new Float64Array(size);
  if (typeof column === "number") return values.fill(column);
  let at = 0, value = 0, place = 1;
  for (let i = 0; i < column.length; i++) {
    const digit = DIGIT_OF[column.charCodeAt(i)];
    value += (digit & 31) * place;
    if (digit & 32) {
      place *= 32;
    } else {
      values[at++] = value;
      value = 0;
      place = 1;
    }
  }
  return values;
}

function scaled(values, factor) {
  for (let i = 0; i < values.length; i++) values[i] *= factor;
  return values;
}

function added(values, others) {
  for (let i = 0; i < values.length; i++) values[i] += others[i];
  return values;
}

function summed(steps) {
  for (let i = 1; i < steps.length; i++) steps[i] += steps[i - 1];
  return steps;
}

const bars = (() => {
  const packed = given.bars, size = packed.size, tick = packed.tick_s;
  const column = (name) => unpack(packed[name], size);
  const start = scaled(summed(column("start_steps")), tick);
  const end = added(scaled(column("lengths"), tick), start);
  const setUpEnd = added(scaled(column("set_ups"), tick), start);
  const notes = new Map();
  const at = summed(unpack(packed.notes.bar_steps, packed.notes.size));
  const text = unpack(packed.notes.text, packed.notes.size);
  for (let i = 0; i < at.length; i++) notes.set(at[i], packed.notes.texts[text[i]]);
  return {
    size, start, end, setUpEnd, notes,
    row: column("row"),
    order: column("order"),
    group: column("group"),
    family: column("family"),
    paused: column("paused_s"),
    heads: column("heads"),
    way: column("way_s"),
    round: column("round"),
    part: column("part"),
    parts: column("parts"),
  };
})();

const orders = (() => {
  const size = given.orders.ids.length;
  const due = unpack(given.orders.due_s, size), dueFrom = given.orders.due_from_s; // 0 is no due time
  const release = unpack(given.orders.release_s, size), finish = unpack(given.orders.finish_s, size);
  const first = new Float64Array(size).fill(Infinity);
  for (let bar = 0; bar < bars.size; bar++) {
    first[bars.order[bar]] = Math.min(first[bars.order[bar]], bars.start[bar]);
  }
  for (let order = 0; order < size; order++) due[order] = due[order] ? due[order] - 1 + dueFrom : Infinity;
  return { size, ids: given.orders.ids, due, release, first, finish, binds: given.orders.binds };
})();

const changes = (() => {
  const packed = given.changeovers, size = packed.size, column = (name) => unpack(packed[name], size);
  const bar = summed(column("bar_steps")), start = column("ahead_s"), end = column("done_ahead_s");
  const of = new Map();
  for (let i = 0; i < size; i++) {
    start[i] = bars.start[bar[i]] - start[i];
    end[i] = bars.start[bar[i]] - end[i];
    of.set(bar[i], i);
  }
  return { size, bar, start, end, of, seconds: column("seconds"), before: column("before") };
})();

const crews = given.crews.map((crew) => ({
  ...crew,
  at: summed(unpack(crew.at_steps, crew.size)),
  used: unpack(crew.used, crew.size),
  there: unpack(crew.there, crew.size),
}));

const load = given.load && { ...given.load, share: unpack(given.load.share, given.load.size) };

const groups = given.groups, families = given.families, familyGroups = given.family_groups;
const machines = given.rows.map((row) => ({
  ...row,
  label: row.unit ? `${row.machine} unit ${row.unit}` : row.machine,
}));
const closures = given.closures;

function isLate(order) {
  return orders.finish[order] > orders.due[order];
}

// Lists of bars by some key, kept as one array with the place where each list begins. Bars come
// sorted by start, so every list is too.
function listed(keys, size) {
  const begin = new Uint32Array(size + 1);
  for (const key of keys) if (key >= 0) begin[key + 1]++;
  for (let i = 0; i < size; i++) begin[i + 1] += begin[i];
  const next = begin.slice(), items = new Uint32Array(begin[size]);
  keys.forEach((key, bar) => {
    if (key >= 0) items[next[key]++] = bar;
  });
  return { size, of: (key) => items.subarray(begin[key], begin[key + 1]) };
}

const barsOfOrder = listed(bars.order, orders.size);

// First place in a list of bars that end after `time`. Bars of one row do not overlap.
function firstEndingAfter(list, time) {
  let low = 0, high = list.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if (bars.end[list[middle]] > time) high = middle;
    else low = middle + 1;
  }
  return low;
}

// Names on a canvas stand on one line; controls and turned reading order stay inside the name.
function oneLine(text) {
  return text.replace(/[\s\u0000-\u001f\u007f-\u009f]+/gu, " ").trim() || "(blank)";
}

// Inside a sentence a name keeps its reading direction to itself.
function named(text) {
  return `\u2068${oneLine(text)}\u2069`;
}

function count(size, noun) {
  return `${size.toLocaleString("en-GB")} ${noun}${size === 1 ? "" : "s"}`;
}
