// While the job is watched: hears of new results, reloads, and puts the reader back where they were. Marks, columns and
// filters are kept by name, as their numbers may differ in the new page.
const KEPT = "hubtack-kept";
const BOXES = "#relative-ellipses, [data-toggle]";

function keptTable(table) {
  const key = (column) => table.data.headings[column].key;
  return {
    words: table.words,
    flagged: select("[data-flagged]", table.tools)?.checked ?? false,
    filters: [...table.filters].map(([column, value]) => [key(column), table.data.columns[column].words[value]]),
    sorted: table.sorted && { key: key(table.sorted.column), direction: table.sorted.direction },
    leaf: table.leaf,
  };
}

// The section at the top of the window and how far it is scrolled past: sections above may grow or shrink.
const sections = selectAll("main section[aria-labelledby]");
const called = (section) => section.getAttribute("aria-labelledby");
function place() {
  if (scrollY === 0) return null;
  const section = sections.filter((each) => each.getBoundingClientRect().top <= 1).at(-1);
  return section && { section: called(section), top: section.getBoundingClientRect().top };
}

function goTo(kept) {
  const section = kept && sections.find((each) => called(each) === kept.section);
  if (section) scrollBy({ top: section.getBoundingClientRect().top - kept.top, behavior: "instant" });
}

function keep() {
  const kept = {
    place: place(),
    view: { x: view.x, y: view.y, width: view.width / drawing.width },
    chosen: choice.marks.map((mark) => names[mark]),
    only: choice.only,
    exaggeration: slider?.value,
    probability: document.getElementById("probability")?.value,
    boxes: selectAll(BOXES).map((box) => box.checked),
    tables: Object.fromEntries([...tables].map(([name, table]) => [name, keptTable(table)])),
  };
  sessionStorage.setItem(KEPT, JSON.stringify(kept));
}

function put(control, value, event) {
  if (!control || value === undefined) return;
  control.value = value;
  control.dispatchEvent(new Event(event));
}

function restoreTable(table, kept) {
  const column = (key) => table.data.headings.findIndex((heading) => heading.key === key);
  const flagged = select("[data-flagged]", table.tools);
  if (flagged) flagged.checked = kept.flagged;
  put(select("[data-search]", table.tools), kept.words, "input");
  for (const [key, word] of kept.filters) {
    const place = column(key), value = place < 0 ? -1 : table.data.columns[place].words.indexOf(word);
    const heading = table.data.headings[place]?.name;
    const label = selectAll("[data-choices] label", table.tools).find((each) => each.firstChild.textContent === heading);
    if (value >= 0 && label) put(select("select", label), String(value), "change");
  }
  const place = kept.sorted ? column(kept.sorted.key) : -1;
  if (place >= 0) {
    table.sort(place);
    if (kept.sorted.direction === "descending") table.sort(place);
  } else {
    table.filter();
  }
  const last = Math.ceil((table.rows ?? []).length / ROWS_AT_ONCE) - 1;
  if (table.data.rows > ROWS_WHOLE && kept.leaf) table.turn(Math.max(0, Math.min(kept.leaf, last)));
}

function restore(kept) {
  for (const [name, table] of tables) if (kept.tables[name]) restoreTable(table, kept.tables[name]);
  const chosen = kept.chosen.map((name) => names.indexOf(name));
  if (chosen.length && !chosen.includes(-1)) {
    choose(chosen);
    setOnly(kept.only);
  }
  put(slider, kept.exaggeration, "input");
  put(document.getElementById("probability"), kept.probability, "change");
  selectAll(BOXES).forEach((box, place) => {
    box.checked = kept.boxes[place] ?? box.checked;
    box.dispatchEvent(new Event("change"));
  });
  look(kept.view.x, kept.view.y, kept.view.width * drawing.width);
  goTo(kept.place);
}

const news = element("section", { class: "cautions", id: "news", role: "status", hidden: true });
Object.assign(news.style, { borderInlineStart: "6px solid", paddingInlineStart: "1rem" });
select("main").prepend(news);
function linesOf(text) {
  const made = element("pre", {}, text);
  Object.assign(made.style, { whiteSpace: "pre-wrap", overflowWrap: "anywhere" });
  return made;
}

function tell({ change, trouble }) {
  const here = place();
  news.replaceChildren();
  if (trouble) news.append(element("h2", {}, "The tables as they are now cannot be adjusted"), linesOf(trouble));
  if (trouble) news.append(element("p", {}, "The page shows the last run that could."));
  else if (change.length) news.append(element("h2", {}, "Since the last run"), linesOf(change.join("\n")));
  news.hidden = !news.childElementCount;
  goTo(here);
}

const kept = sessionStorage.getItem(KEPT);
sessionStorage.removeItem(KEPT);
history.scrollRestoration = "manual";
if (kept) restore(JSON.parse(kept));
new EventSource("/news").addEventListener("message", (event) => {
  const told = JSON.parse(event.data);
  if (told.version === PAGE_VERSION) return tell(told);
  keep();
  return location.reload();
});
