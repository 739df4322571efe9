// Details of one bar: in the box at the pointer, and said for those who do not see it.

// How long a bar is worked on: closures that it spans are no work.
function workText(bar) {
  const long = bars.end[bar] - bars.start[bar], shut = bars.paused[bar];
  return shut ? `${duration(long - shut)} of work, ${duration(shut)} closed` : duration(long);
}

function partText(bar) {
  return bars.parts[bar] > 1 ? `part ${bars.part[bar]} of ${bars.parts[bar]}` : "";
}

function setUpText(bar) {
  const long = bars.setUpEnd[bar] - bars.start[bar];
  return long ? `set-up to ${say(bars.setUpEnd[bar])}` : "";
}

function headsText(bar) {
  const machine = machines[bars.row[bar]];
  if (!bars.heads[bar]) return "";
  const when = machine.set_up_only ? " for the set-up only" : "";
  return `${count(bars.heads[bar], "head")} of crew ${named(machine.crew)}${when}`;
}

function wayText(bar) {
  return bars.way[bar] ? `${duration(bars.way[bar])} on the way` : "";
}

function familyLines(bar) {
  if (!families.length) return [];
  const found = families[bars.family[bar]].name ? [`family ${familyName(bars.family[bar])}`] : [];
  if (changes.of.has(bar)) found.push(changeText(changes.of.get(bar)));
  return found;
}

function detailLines(bar) {
  const order = bars.order[bar], machine = machines[bars.row[bar]];
  const name = machine.name && machine.name !== machine.machine ? ` (${oneLine(machine.name)})` : "";
  const release = orders.release[order] > 0 ? `not before ${say(orders.release[order])}` : "";
  const pieces = [bars.round[bar] ? `round ${bars.round[bar]}` : "", partText(bar)].filter(Boolean).join(", ");
  const note = bars.notes.get(bar);
  return [
    `${oneLine(machine.label)}${name}`,
    [span(bars.start[bar], bars.end[bar]), workText(bar), setUpText(bar)].filter(Boolean).join(", "),
    ...familyLines(bar),
    headsText(bar),
    `order ends ${say(orders.finish[order])}, ${standing(order)}`,
    wayText(bar) && `then ${wayText(bar)}`,
    release,
    pieces,
    note ? `note: ${oneLine(note)}` : "",
  ].filter(Boolean);
}

// Show a box at the pointer for a bar, or else for a thing with a title and lines; none for neither.
function showTip(bar, x, y, thing = null) {
  if (bar < 0 && !thing) {
    tip.hidden = true;
    return;
  }
  const title = bar < 0 ? thing.title : oneLine(orders.ids[bars.order[bar]]);
  const shown = bar < 0 ? thing.lines : detailLines(bar);
  while (tip.children.length < shown.length + 1) tip.append(element("p"));
  while (tip.children.length > shown.length + 1) tip.lastElementChild.remove();
  tip.children[0].textContent = title;
  shown.forEach((line, i) => (tip.children[i + 1].textContent = line));
  tip.hidden = false;
  const { offsetWidth: width, offsetHeight: height } = tip, edge = 8;
  const left = x + 16 + width + edge > innerWidth ? x - 16 - width : x + 16;
  const top = y + 18 + height + edge > innerHeight ? y - 12 - height : y + 18;
  tip.style.transform = `translate(${Math.max(edge, left)}px, ${Math.max(edge, top)}px)`;
}

function sayBar(bar) {
  said.textContent = `${named(orders.ids[bars.order[bar]])}: ${detailLines(bar).join("; ")}`;
}
