// Last: put everything up.

buildLegend();
byId("by-family").hidden = !families.length;
byId("by-family").setAttribute("aria-pressed", String(state.byFamily));
[state.from, state.to] = openingWindow();
byId("late-only").hidden = !orders.due.some((due) => due < Infinity);
byId("now").hidden = !onTheWall;
byId("now").setAttribute("aria-pressed", String(state.nowShown));
byId("opening").hidden = given.window_s[0] <= 0 && given.window_s[1] >= given.horizon_s;
relay();
new ResizeObserver(() => once("relay", relay)).observe(chart);
document.documentElement.dataset.ready = "yes";
