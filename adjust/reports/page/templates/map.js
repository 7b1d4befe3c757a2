// The map: pan, zoom, figures under the pointer, choice of marks and lines. What stands in the page is only moved and
// sized; labels, ticks, the scale bar and relative ellipses are drawn for what is in view.
const drawing = figures.map;
const map = document.getElementById("map");
const card = document.getElementById("card");
const xs = unpacked(drawing.x).map((cell) => (cell === "" ? NaN : Number(cell) / 100));
const ys = unpacked(drawing.y).map((cell) => (cell === "" ? NaN : Number(cell) / 100));
const drawn = xs.map((_, mark) => mark).filter((mark) => !Number.isNaN(xs[mark]));
const ordered = ranks(names).map((rank, mark) => [rank, mark]).filter(([, mark]) => !Number.isNaN(xs[mark]))
  .sort((one, other) => one[0] - other[0]).map(([, mark]) => mark);
const view = { x: 0, y: 0, width: drawing.width, height: drawing.height };
const LABELS = 260, CANDIDATES = 2000, LETTER = 6.6, LINE = 13, NEAR_MARK = 14, NEAR_LINE = 6, RELATIVES = 500, CROWD = 1500, DEEPEST = 4000;
const SVG = "http://www.w3.org/2000/svg";

function shape(name, attributes, text) {
  const made = document.createElementNS(SVG, name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  if (text !== undefined) made.textContent = text;
  return made;
}

// Pixels of the screen in a unit of the drawing.
function magnification() {
  const box = map.getBoundingClientRect();
  return Math.min(box.width / view.width, box.height / view.height) || 1;
}

// Width of the map over its height, as it stands on the screen.
function proportion() {
  const box = map.getBoundingClientRect();
  return box.width && box.height ? box.width / box.height : drawing.width / drawing.height;
}

function toDrawing(event) {
  const box = map.getBoundingClientRect(), scale = magnification();
  const left = (box.width - view.width * scale) / 2, top = (box.height - view.height * scale) / 2;
  return [view.x + (event.clientX - box.left - left) / scale, view.y + (event.clientY - box.top - top) / scale];
}

function look(x, y, width) {
  view.width = Math.min(Math.max(width, drawing.width / DEEPEST), drawing.width * 4);
  view.height = view.width / proportion();
  view.x = Math.min(Math.max(x, -view.width * 0.7), drawing.width - view.width * 0.3);
  view.y = Math.min(Math.max(y, -view.height * 0.7), drawing.height - view.height * 0.3);
  map.setAttribute("viewBox", `${view.x} ${view.y} ${view.width} ${view.height}`);
  redraw();
}

function zoom(factor, x = view.x + view.width / 2, y = view.y + view.height / 2) {
  const width = view.width / factor;
  look(x - (x - view.x) / factor, y - (y - view.y) / factor, width);
}

function whole() {
  const width = Math.max(drawing.width, drawing.height * proportion()), height = width / proportion();
  look((drawing.width - width) / 2, (drawing.height - height) / 2, width);
}

// Whether the reader has come nearer than the whole, which then has to stay.
function near() {
  return view.width < drawing.width * 0.999;
}

function centre(mark, width) {
  if (!Number.isNaN(xs[mark])) look(xs[mark] - width / 2, ys[mark] - width / proportion() / 2, width);
}

let waiting = 0;
let letters = 1;
function redraw() {
  cancelAnimationFrame(waiting);
  waiting = requestAnimationFrame(() => {
    const scale = magnification();
    letters = parseFloat(getComputedStyle(document.documentElement).fontSize) * 0.78 / 12;
    map.style.fontSize = `${12 * letters / scale}px`;
    const inView = drawn.filter((mark) => inside(xs[mark], ys[mark]));
    map.classList.toggle("crowded", inView.length > CROWD);
    drawLabels(scale, inView);
    drawFurniture(scale);
    drawRelatives();
    drawHalo();
  });
}

function inside(x, y) {
  return x >= view.x && x <= view.x + view.width && y >= view.y && y <= view.y + view.height;
}

// Names of the marks in view, the chosen and the most important first, where they cover neither each other nor a mark.
function drawLabels(scale, inView) {
  const taken = new Map(), cell = 40;
  const cellsOf = ([left, top, right, bottom]) => {
    const cells = [];
    for (let column = Math.floor(left / cell); column <= Math.floor(right / cell); column++) {
      for (let row = Math.floor(top / cell); row <= Math.floor(bottom / cell); row++) cells.push(column * 100003 + row);
    }
    return cells;
  };
  const free = (box) => cellsOf(box).every((key) => (taken.get(key) ?? []).every((other) =>
    box[0] >= other[2] || other[0] >= box[2] || box[1] >= other[3] || other[1] >= box[3]));
  const take = (box) => cellsOf(box).forEach((key) => {
    if (taken.has(key)) taken.get(key).push(box);
    else taken.set(key, [box]);
  });
  const right = view.width * scale, labels = [];
  const on = (mark) => [(xs[mark] - view.x) * scale, (ys[mark] - view.y) * scale];
  for (const mark of inView) {
    const [x, y] = on(mark);
    take([x - 4, y - 4, x + 4, y + 4]);
  }
  const candidates = [...choice.marks.filter((mark) => inside(xs[mark], ys[mark])), ...importance(inView).slice(0, CANDIDATES)];
  for (const mark of new Set(candidates)) {
    const text = names[mark].length > 18 ? `${names[mark].slice(0, 17)}…` : names[mark];
    const width = LETTER * letters * text.length, [x, y] = on(mark);
    for (const [across, down, anchor] of [[8, -6, "start"], [-8, -6, "end"], [8, 14, "start"], [-8, 14, "end"]]) {
      const start = anchor === "start" ? x + across : x + across - width;
      const box = [start, y + down - LINE * letters + 2, start + width, y + down + 2];
      if (start >= 0 && start + width <= right && free(box)) {
        take(box);
        labels.push(shape("text", { x: xs[mark] + across / scale, y: ys[mark] + down / scale, "text-anchor": anchor }, text));
        break;
      }
    }
    if (labels.length >= LABELS) break;
  }
  select("[data-labels]", map).replaceChildren(...labels);
}

// The table of marks lists the least certain first; so do the labels, after the held marks.
let byImportance = null;
function importance(inView) {
  const table = tables.get("marks");
  if (!byImportance) {
    const column = table.data.headings.findIndex((heading) => heading.key === "plan_status");
    const statuses = column < 0 ? [] : table.cells(column);
    byImportance = new Float64Array(names.length).fill(Infinity);
    table.marks.forEach(([mark], row) => { byImportance[mark] = row + (["fixed", "weighted"].includes(statuses[row]) ? -1e9 : 0); });
  }
  return [...inView].sort((one, other) => byImportance[one] - byImportance[other]);
}

function niceBelow(value) {
  const power = 10 ** Math.floor(Math.log10(value));
  return [5, 2, 1].map((step) => step * power).find((step) => step <= value * (1 + 1e-9)) ?? power;
}

function length(metres) {
  return metres >= 1000 ? `${metres / 1000} km` : metres >= 1 ? `${metres} m` : `${Math.round(metres * 1000)} mm`;
}

// Scale bar, north arrow and grid ticks, of the same size on the screen at every zoom.
function drawFurniture(scale) {
  const furniture = [], ticks = [], px = (pixels) => pixels / scale;
  if (drawing.metres) {
    const left = view.x + px(14), bottom = view.y + view.height - px(26);
    const metres = niceBelow(Math.min(px(150), view.width / 3) * drawing.metres), across = metres / drawing.metres;
    furniture.push(shape("rect", { class: "plate", x: left - px(6), y: bottom - px(24), width: across + px(12), height: px(32) }));
    furniture.push(shape("path", { d: `M${left} ${bottom - px(5)}V${bottom}H${left + across}V${bottom - px(5)}` }));
    furniture.push(shape("text", { x: left, y: bottom - px(9) }, length(metres)));
    const x = view.x + view.width - px(24), y = view.y + px(16);
    furniture.push(shape("path", { class: "solid", d: `M${x} ${y}l${px(6)} ${px(20)}l${px(-6)} ${px(-5)}l${px(-6)} ${px(5)}z` }));
    furniture.push(shape("text", { x, y: y + px(36), "text-anchor": "middle" }, "N"));
    drawTicks(ticks, px);
  }
  select("[data-furniture]", map).replaceChildren(...furniture);
  select("[data-ticks]", map).replaceChildren(...ticks);
}

function drawTicks(ticks, px) {
  const [east, north] = drawing.origin, metres = drawing.metres;
  const step = niceBelow(Math.max(view.width / 3.5, px(240)) * metres);
  const right = view.x + view.width, bottom = view.y + view.height;
  for (let at = Math.ceil((east + view.x * metres) / step) * step; at < east + right * metres; at += step) {
    const x = (at - east) / metres;
    ticks.push(shape("path", { d: `M${x} ${view.y}V${bottom}` }));
    ticks.push(shape("text", { x: x + px(3), y: bottom - px(5) }, `E ${Number(at.toFixed(3))}`));
  }
  for (let at = Math.ceil((north - bottom * metres) / step) * step; at < north - view.y * metres; at += step) {
    const y = (north - at) / metres;
    ticks.push(shape("path", { d: `M${view.x} ${y}H${right}` }));
    ticks.push(shape("text", { x: view.x + px(3), y: y - px(3) }, `N ${Number(at.toFixed(3))}`));
  }
}

// Ellipses of the difference of two places: of the chosen line, and of lines in view where they are asked for.
const lines = tables.get("relative");
function lineFigures() {
  const column = (key) => lines.data.headings.findIndex((heading) => heading.key === key);
  const cells = (key) => (column(key) < 0 ? null : lines.cells(column(key)));
  return { major: cells("ellipse.semi_major_mm"), minor: cells("ellipse.semi_minor_mm"), azimuth: cells("ellipse.azimuth_deg") };
}

function drawRelatives() {
  const asked = document.getElementById("relative-ellipses")?.checked;
  const shapes = [];
  if (lines && drawing.exaggeration && (asked || choice.marks.length === 2)) {
    const { major, minor, azimuth } = lineFigures();
    const size = exaggeration() * (probability() === "standard" ? 1 : drawing.ellipseFactor) / drawing.metres / 1000;
    for (let row = 0; row < lines.data.rows && shapes.length < RELATIVES && major; row++) {
      const [a, b] = lines.marks[row];
      const chosen = choice.marks.length === 2 && choice.marks.includes(a) && choice.marks.includes(b);
      const x = (xs[a] + xs[b]) / 2, y = (ys[a] + ys[b]) / 2;
      if ((asked || chosen) && Number(major[row]) > 0 && inside(x, y)) {
        const turn = Number(azimuth[row]) - 90;
        shapes.push(shape("ellipse", { rx: major[row] * size, ry: minor[row] * size, transform: `translate(${x} ${y}) rotate(${turn})` }));
      }
    }
    if (asked && shapes.length === RELATIVES) said.textContent = `Relative ellipses of the ${RELATIVES} least certain lines in view; come nearer for the others`;
  }
  select("[data-relatives]", map).replaceChildren(...shapes);
}

function drawHalo() {
  const seen = choice.marks.filter((mark) => !Number.isNaN(xs[mark]));
  const shapes = [];
  if (seen.length > 1) {
    const [first, ...others] = seen;
    for (const other of others) shapes.push(shape("path", { class: "way", d: `M${xs[first]} ${ys[first]}L${xs[other]} ${ys[other]}` }));
  }
  for (const mark of seen) shapes.push(shape("path", { class: "ring", d: `M${xs[mark]} ${ys[mark]}h.01` }));
  select("[data-halo]", map).replaceChildren(...shapes);
}

const slider = document.getElementById("exaggeration");
const STEPS = [1, 2, 5];
function exaggeration() {
  if (!slider || !drawing.exaggeration) return drawing.exaggeration ?? 1;
  const power = Math.floor(Math.log10(drawing.exaggeration) + 1e-9);
  const start = STEPS.indexOf(Math.round(drawing.exaggeration / 10 ** power));
  const place = start + Number(slider.value) - 6;
  return STEPS[((place % 3) + 3) % 3] * 10 ** (power + Math.floor(place / 3));
}

function probability() {
  return document.getElementById("probability")?.value ?? "confidence";
}

function resize() {
  const factor = drawing.exaggeration ? exaggeration() / drawing.exaggeration : 2 ** ((Number(slider?.value ?? 6) - 6) / 2);
  const standard = probability() === "standard";
  select(".ellipses", map).style.setProperty("--exaggeration", factor / (standard ? drawing.ellipseFactor : 1));
  select(".bars", map).style.setProperty("--exaggeration", factor / (standard ? drawing.barFactor : 1));
  const words = drawing.exaggeration ? counted(exaggeration()) : factor.toFixed(2);
  const output = document.getElementById("exaggeration-words");
  if (output) output.textContent = `${words} times`;
  const note = document.getElementById("drawn-at");
  if (note) note.textContent = words;
  slider?.setAttribute("aria-valuetext", `${words} times`);
  drawRelatives();
}

function nearestMark(x, y, reach) {
  let best = null, closest = reach * reach;
  for (const mark of drawn) {
    const square = (xs[mark] - x) ** 2 + (ys[mark] - y) ** 2;
    if (square < closest) [best, closest] = [mark, square];
  }
  return best;
}

function nearestLine(x, y, reach) {
  let best = null, closest = reach * reach;
  if (!lines) return best;
  for (let row = 0; row < lines.data.rows; row++) {
    const [a, b] = lines.marks[row], across = xs[b] - xs[a], down = ys[b] - ys[a];
    const along = Math.min(1, Math.max(0, ((x - xs[a]) * across + (y - ys[a]) * down) / (across * across + down * down)));
    const square = (xs[a] + along * across - x) ** 2 + (ys[a] + along * down - y) ** 2;
    if (square < closest) [best, closest] = [row, square];
  }
  return best;
}

// What lies under a point: a table and its row.
function under(event) {
  const [x, y] = toDrawing(event), scale = magnification();
  const mark = nearestMark(x, y, NEAR_MARK / scale);
  if (mark !== null) return { table: tables.get("marks"), row: rowOfMark(mark) };
  const row = nearestLine(x, y, NEAR_LINE / scale);
  return row === null ? null : { table: lines, row };
}

let markRows = null;
function rowOfMark(mark) {
  if (!markRows) {
    markRows = new Map();
    tables.get("marks").marks.forEach(([each], row) => markRows.set(each, row));
  }
  return markRows.get(mark);
}

function figuresOf({ table, row }) {
  return table.data.headings.map(({ name, unit }, column) => [unit ? `${name}, ${unit}` : name, table.cells(column)[row]])
    .filter(([, text], column) => column > 0 && text);
}

function showCard(found, event) {
  card.hidden = !found;
  if (!found) return;
  const list = element("dl");
  for (const [name, text] of figuresOf(found).slice(0, 12)) list.append(element("dt", {}, name), element("dd", {}, text));
  card.replaceChildren(element("strong", {}, found.table.called(found.table.marks[found.row])), list);
  const box = map.getBoundingClientRect(), x = event.clientX - box.left, y = event.clientY - box.top;
  card.style.left = `${Math.max(0, x > box.width / 2 ? x - card.offsetWidth - 14 : x + 14)}px`;
  card.style.top = `${Math.max(0, Math.min(y + 10, box.height - card.offsetHeight))}px`;
}

function chooseOn(found) {
  if (!found) return choose([], "Nothing chosen");
  const marks = found.table.marks[found.row];
  const words = figuresOf(found).map(([name, text]) => `${name} ${text}`).join("; ");
  choose(marks, `${found.table.called(marks)}: ${words}`);
}

function walk(step) {
  const now = ordered.indexOf(choice.marks[0]);
  const next = ordered[(now < 0 ? (step > 0 ? 0 : ordered.length - 1) : now + step + ordered.length) % ordered.length];
  chooseOn({ table: tables.get("marks"), row: rowOfMark(next) });
  if (!inside(xs[next], ys[next])) centre(next, view.width);
}

const KEYS = {
  ArrowLeft: () => look(view.x - view.width / 8, view.y, view.width),
  ArrowRight: () => look(view.x + view.width / 8, view.y, view.width),
  ArrowUp: () => look(view.x, view.y - view.height / 8, view.width),
  ArrowDown: () => look(view.x, view.y + view.height / 8, view.width),
  "+": () => zoom(1.5), "=": () => zoom(1.5), "-": () => zoom(1 / 1.5), 0: whole,
  n: () => walk(1), p: () => walk(-1), Enter: () => setOnly(!choice.only), Escape: () => choose([], "Nothing chosen"),
};
map.addEventListener("keydown", (event) => {
  const act = event.ctrlKey || event.metaKey || event.altKey ? null : KEYS[event.key.length === 1 ? event.key.toLowerCase() : event.key];
  if (!act || !drawn.length) return;
  event.preventDefault();
  act();
});

const pointers = new Map();
let moved = false;
map.addEventListener("pointerdown", (event) => {
  pointers.set(event.pointerId, [event.clientX, event.clientY]);
  moved = false;
});
map.addEventListener("pointermove", (event) => {
  const last = pointers.get(event.pointerId);
  if (!last) return event.pointerType === "mouse" ? showCard(under(event), event) : undefined;
  const step = [event.clientX - last[0], event.clientY - last[1]];
  if (!moved && Math.hypot(...step) < 4) return undefined;
  if (!moved) map.setPointerCapture(event.pointerId);
  moved = true;
  card.hidden = true;
  map.classList.add("dragging");
  if (pointers.size === 2) pinch(event, last);
  else look(view.x - step[0] / magnification(), view.y - step[1] / magnification(), view.width);
  pointers.set(event.pointerId, [event.clientX, event.clientY]);
  return undefined;
});

function pinch(event, last) {
  const other = [...pointers].find(([id]) => id !== event.pointerId)[1];
  const before = Math.hypot(last[0] - other[0], last[1] - other[1]);
  const after = Math.hypot(event.clientX - other[0], event.clientY - other[1]);
  const middle = { clientX: (event.clientX + other[0]) / 2, clientY: (event.clientY + other[1]) / 2 };
  if (before > 0) zoom(after / before, ...toDrawing(middle));
}

function lift(event) {
  if (event.type === "pointerup" && pointers.has(event.pointerId) && !moved) {
    const found = under(event);
    chooseOn(found);
    showCard(found, event);
  }
  pointers.delete(event.pointerId);
  map.classList.toggle("dragging", pointers.size > 0);
}
map.addEventListener("pointerup", lift);
map.addEventListener("pointercancel", lift);
map.addEventListener("pointerleave", () => { card.hidden = true; });
// The wheel moves the page until the map is in use.
map.addEventListener("wheel", (event) => {
  if (!event.ctrlKey && document.activeElement !== map) return;
  event.preventDefault();
  zoom(Math.exp(-event.deltaY / 400), ...toDrawing(event));
}, { passive: false });
map.addEventListener("focus", () => map.classList.add("active"));
map.addEventListener("blur", () => map.classList.remove("active"));

const chip = element("aside", { class: "chip", hidden: true, "aria-label": "Chosen" });
document.body.append(chip);
function showChip() {
  chip.hidden = choice.marks.length === 0;
  if (chip.hidden) return;
  const only = element("button", { type: "button", "aria-pressed": String(choice.only) }, choice.only ? "All rows" : "Only its rows");
  only.addEventListener("click", () => setOnly(!choice.only));
  const none = element("button", { type: "button" }, "Let go");
  none.addEventListener("click", () => choose([], "Nothing chosen"));
  chip.replaceChildren(element("strong", {}, tables.get("marks").called(choice.marks)), only, none);
}

const suspectItems = selectAll(".suspects li[data-marks]").map((item) => [item, item.dataset.marks.split(" ").map(Number)]);
for (const [item, marks] of suspectItems) {
  const name = select("strong", item);
  const button = element("button", { type: "button" }, "Show");
  button.setAttribute("aria-label", `Show ${name.textContent}`);
  button.addEventListener("click", () => {
    choose(marks, `Chosen: ${name.textContent}`);
    map.scrollIntoView({ block: "center" });
  });
  name.parentElement.append(" ", button);
}

choice.listeners.push(() => {
  drawHalo();
  redraw();
  showChip();
  for (const [item, marks] of suspectItems) item.classList.toggle("chosen", belongs(marks));
});

select(".map-tools").hidden = false;
selectAll("[data-zoom]").forEach((button) => button.addEventListener("click", () => {
  ({ in: () => zoom(1.5), out: () => zoom(1 / 1.5), whole })[button.dataset.zoom]();
}));
selectAll("[data-toggle]").forEach((box) => box.addEventListener("change", () => {
  for (const layer of selectAll(`[data-layer="${box.dataset.toggle}"]`, map)) layer.toggleAttribute("hidden", !box.checked);
}));
slider?.addEventListener("input", resize);
document.getElementById("probability")?.addEventListener("change", resize);
document.getElementById("relative-ellipses")?.addEventListener("change", drawRelatives);
const search = document.getElementById("find-mark");
search.addEventListener("focus", () => {
  const list = document.getElementById("mark-names");
  if (!list.children.length) list.append(...ordered.slice(0, 2000).map((mark) => element("option", { value: names[mark] })));
});
search.addEventListener("change", () => {
  const mark = names.indexOf(search.value);
  if (mark < 0) {
    said.textContent = `No mark ${search.value}`;
    return;
  }
  chooseOn({ table: tables.get("marks"), row: rowOfMark(mark) });
  centre(mark, Math.min(view.width, drawing.width / 3));
});
addEventListener("resize", () => (near() ? redraw() : whole()));
addEventListener("beforeprint", () => {
  whole();
  for (const table of tables.values()) table.print(true);
});
addEventListener("afterprint", () => {
  for (const table of tables.values()) table.print(false);
});
resize();
whole();
