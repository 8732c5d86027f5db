// Moves along designs that were worked out beforehand: every text shown stands in the embedded data.
(() => {
  "use strict";
  const data = JSON.parse(document.getElementById("explorer-data").textContent);
  const panel = document.getElementById("explorer-panel");
  const slider = document.getElementById("explorer-slider");
  const results = document.getElementById("explorer-results");
  const find = (name) => document.querySelector(`[data-part="${name}"]`);
  const partsOf = (id) => document.querySelectorAll(`[data-walk="${id}"]`);
  const [label, now, design, times, checks] = ["label", "now", "design", "times", "checks"].map(find);
  const svgNamespace = "http://www.w3.org/2000/svg";
  let walk = data.walks[0];

  const make = (name, text, attributes = {}) => {
    const made = document.createElement(name);
    made.textContent = text;
    for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
    return made;
  };

  const rect = (kind, attributes) => {
    const made = document.createElementNS(svgNamespace, kind);
    for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
    return made;
  };

  const bar = (state, begin, length) => {
    const drawn = rect("svg", { class: "margin", width: "100%", height: "16", "aria-hidden": "true" });
    drawn.append(
      rect("rect", { class: "track", x: "20%", y: "4", width: "80%", height: "8" }),
      rect("rect", { class: `bar ${state}`, x: `${begin}%`, y: "4", width: `${length}%`, height: "8" }),
      rect("line", { class: "limit", x1: "20%", x2: "20%", y1: "0", y2: "16" }),
    );
    return drawn;
  };

  const checkRow = ([name, value, limit, room, corner, state, begin, length]) => {
    const row = make("tr", "", { role: "row" });
    const barCell = make("td", "", { class: "bar-cell", role: "cell" });
    barCell.append(bar(state, begin, length));
    const roomCell = make("td", "", { class: "number lead", role: "cell" });
    roomCell.append(make("span", data.texts[room], { class: `state ${state}` }));
    row.append(
      make("th", data.texts[name], { scope: "row", role: "rowheader" }),
      roomCell,
      barCell,
      make("td", data.texts[value], { class: "number", role: "cell", "data-label": "value" }),
      make("td", data.texts[limit], { class: "number", role: "cell", "data-label": "limit" }),
      make("td", data.texts[corner], { role: "cell" }),
    );
    return row;
  };

  const timeEntry = (name, words) => {
    const entry = make("div", "");
    entry.append(make("dt", name), make("dd", words));
    return entry;
  };

  const show = () => {
    const at = Number(slider.value);
    const point = walk.points[at];
    const chosen = at === walk.chosen ? " (this design)" : "";
    slider.setAttribute("aria-valuetext", `${point.name}${chosen}`);
    now.textContent = `${point.name}${chosen}: ${point.standing}`;
    now.className = `now state ${point.holds ? "holds" : "fails"}`;
    design.textContent = point.design;
    times.replaceChildren(...data.times.map((name, k) => timeEntry(name, point.times[k])));
    checks.replaceChildren(...point.checks.map(checkRow));
    const cursor = document.querySelector(`[data-walk="${walk.id}"] .cursor`);
    if (cursor) {
      const share = walk.cursors[at];
      cursor.style.display = share === null ? "none" : "";
      for (const end of ["x1", "x2"]) cursor.setAttribute(end, `${share ?? 0}%`);
    }
  };

  const choose = (id) => {
    walk = data.walks.find((one) => one.id === id);
    label.textContent = document.querySelector(`[data-walk="${id}"] h3`).textContent;
    slider.max = walk.points.length - 1;
    slider.value = walk.chosen ?? 0;
    find("back").hidden = walk.chosen === null;
    for (const one of data.walks) {
      for (const part of partsOf(one.id)) part.hidden = one.id !== id;
    }
    show();
  };

  const step = (by) => {
    slider.value = Number(slider.value) + by;
    show();
  };

  slider.addEventListener("input", show);
  find("before").addEventListener("click", () => step(-1));
  find("after").addEventListener("click", () => step(1));
  find("back").addEventListener("click", () => step(walk.chosen - Number(slider.value)));
  for (const radio of panel.querySelectorAll("input[type=radio]")) {
    radio.addEventListener("change", () => choose(radio.value));
  }
  for (const table of document.querySelectorAll("details.walk")) table.open = false;
  // paper shows every walk, the screen the one being moved along
  window.addEventListener("beforeprint", () => {
    for (const part of document.querySelectorAll("[data-walk]")) part.hidden = false;
  });
  window.addEventListener("afterprint", () => choose(walk.id));
  choose(walk.id);
  panel.hidden = results.hidden = false;
})();
