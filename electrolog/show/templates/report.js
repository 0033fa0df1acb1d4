"use strict";
// A chart is one stop of the Tab key; the arrow keys then go through what is drawn, from left to right, and it is said.
const chartOf = (target) => (target instanceof Element ? target.closest("svg.chart[tabindex]") : null);
const left = (path) => parseFloat(path.getAttribute("d").slice(1));
const told = (chart) => Array.from(chart.querySelectorAll("path")).filter((path) => path.firstElementChild);
const marks = new WeakMap();
const marksOf = (chart) => {
  if (!marks.has(chart)) { marks.set(chart, { paths: told(chart).sort((a, b) => left(a) - left(b)), at: -1 }); }
  return marks.get(chart);
};
const show = (chart, at) => {
  const known = marksOf(chart), said = chart.parentElement.querySelector("output");
  if (known.at >= 0) { known.paths[known.at].classList.remove("chosen"); }
  known.at = at;
  if (at < 0) { said.textContent = ""; return; }
  known.paths[at].classList.add("chosen");
  said.textContent = `${at + 1} of ${known.paths.length}: ${known.paths[at].firstElementChild.textContent}`;
};
for (const chart of document.querySelectorAll("svg.chart[tabindex]")) {
  // Of an image a screen reader keeps the keys to itself.
  chart.setAttribute("role", "application");
  chart.setAttribute("aria-roledescription", "chart, read by the arrow keys");
}
document.addEventListener("focusin", (event) => {
  const chart = chartOf(event.target);
  if (chart && marksOf(chart).at < 0) { chart.parentElement.querySelector("output").textContent = "arrow keys: from value to value"; }
});
document.addEventListener("focusout", (event) => { const chart = chartOf(event.target); if (chart) { show(chart, -1); } });
document.addEventListener("mouseover", (event) => {
  const chart = chartOf(event.target);
  const at = chart ? marksOf(chart).paths.indexOf(event.target.closest("path")) : -1;
  if (at >= 0) { show(chart, at); }
});
document.addEventListener("keydown", (event) => {
  const chart = chartOf(event.target);
  if (!chart || event.altKey || event.ctrlKey || event.metaKey) { return; }
  const { at, paths } = marksOf(chart), last = paths.length - 1;
  const to = { ArrowRight: Math.min(at + 1, last), ArrowDown: Math.min(at + 1, last), ArrowLeft: Math.max(at - 1, 0), ArrowUp: Math.max(at - 1, 0), Home: 0, End: last, Escape: -1 }[event.key];
  if (to === undefined) { return; }
  event.preventDefault();
  show(chart, to);
});
for (const table of document.querySelectorAll("table[data-sortable]")) {
  const body = table.tBodies[0];
  const rows = Array.from(body.rows);
  const value = (row, at) => { const cell = row.cells[at]; return cell.dataset.v === undefined ? cell.textContent : cell.dataset.v; };
  const compare = (a, b) => {
    if (a === "" || b === "") { return a === b ? 0 : a === "" ? 2 : -2; }
    const x = Number(a), y = Number(b);
    return Number.isNaN(x) || Number.isNaN(y) ? a.localeCompare(b, undefined, { numeric: true }) : x - y;
  };
  for (const head of table.tHead.rows[0].cells) {
    const button = head.querySelector("button");
    if (!button) { continue; }
    button.addEventListener("click", () => {
      const up = head.getAttribute("aria-sort") !== "ascending";
      for (const other of table.tHead.rows[0].cells) { other.removeAttribute("aria-sort"); }
      head.setAttribute("aria-sort", up ? "ascending" : "descending");
      const keyed = rows.map((row, place) => [value(row, head.cellIndex), place, row]);
      // What is unknown stands last either way; equals keep their order.
      keyed.sort((a, b) => { const c = compare(a[0], b[0]); return (Math.abs(c) === 2 && (a[0] === "" || b[0] === "") ? c : up ? c : -c) || a[1] - b[1]; });
      body.append(...keyed.map((one) => one[2]));
    });
  }
  const controls = document.querySelector(`[data-for="${table.id}"]`);
  if (!controls) { continue; }
  const words = controls.querySelector("input"), state = controls.querySelector("select"), count = controls.querySelector("output");
  let texts = null;
  const filter = () => {
    texts = texts || rows.map((row) => row.textContent.toLowerCase());
    const wanted = words.value.toLowerCase().split(/\s+/).filter(Boolean);
    let shown = 0;
    rows.forEach((row, place) => {
      const own = row.dataset.state;
      const fits = state.value === "" || (state.value === "usable" ? own !== "retired" : own === state.value);
      row.hidden = !(fits && wanted.every((word) => texts[place].includes(word)));
      shown += row.hidden ? 0 : 1;
    });
    count.textContent = `${shown} of ${rows.length} probes`;
  };
  words.addEventListener("input", filter);
  state.addEventListener("change", filter);
  controls.hidden = false;
  filter();
}
