// Which bars stand in which row: machines as rows, or orders as rows. `placeOf` is where a machine stands, or -1.

function machineRows() {
  return {
    kind: "machines",
    lists: listed(bars.row, machines.length),
    rowOf: (bar) => bars.row[bar],
    label: (row) => oneLine(machines[row].label),
    binds: (row) => machines[row].binds,
    inside: (bar) => {
      const id = oneLine(orders.ids[bars.order[bar]]);
      return bars.parts[bar] > 1 ? [`${id} (${bars.part[bar]}/${bars.parts[bar]})`, id] : [id];
    },
    due: () => Infinity,
    placeOf: (row) => row,
  };
}

// In order of first start, so that the eye follows the work down the page.
function orderRows(keep) {
  const shown = [];
  for (let order = 0; order < orders.size; order++) {
    if (barsOfOrder.of(order).length && keep(order)) shown.push(order);
  }
  shown.sort((a, b) => orders.first[a] - orders.first[b] || a - b);
  const place = new Int32Array(orders.size).fill(-1);
  shown.forEach((order, row) => (place[order] = row));
  return {
    kind: "orders",
    lists: listed(bars.order.map((order) => place[order]), shown.length),
    rowOf: (bar) => place[bars.order[bar]],
    label: (row) => oneLine(orders.ids[shown[row]]),
    binds: (row) => shown[row] === orders.binds,
    inside: (bar) => {
      const machine = machines[bars.row[bar]];
      return machine.unit ? [oneLine(machine.label), oneLine(machine.machine)] : [oneLine(machine.label)];
    },
    due: (row) => orders.due[shown[row]],
    placeOf: () => -1,
  };
}

// The bar of a row at a time, or the nearest within `reach` seconds; -1 if there is none.
function barAt(rows, row, time, reach) {
  const list = rows.lists.of(row);
  const at = firstEndingAfter(list, time);
  if (at < list.length && bars.start[list[at]] <= time) return list[at];
  let best = -1, distance = reach;
  for (const place of [at - 1, at]) {
    if (place < 0 || place >= list.length) continue;
    const bar = list[place];
    const away = Math.max(bars.start[bar] - time, time - bars.end[bar]);
    if (away <= distance) [best, distance] = [bar, away];
  }
  return best;
}

// The next bar for the arrow keys: along its row, or the one nearest in time in the next row that has any.
function neighbour(rows, bar, right, down) {
  const row = rows.rowOf(bar);
  if (down === 0) {
    const list = rows.lists.of(row), place = list.indexOf(bar) + right;
    return place < 0 || place >= list.length ? bar : list[place];
  }
  const middle = (bars.start[bar] + bars.end[bar]) / 2;
  for (let next = row + down; next >= 0 && next < rows.lists.size; next += down) {
    const near = barAt(rows, next, middle, Infinity);
    if (near >= 0) return near;
  }
  return bar;
}
