"use strict";
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
