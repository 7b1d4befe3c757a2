const figures = JSON.parse(document.getElementById("figures").textContent);
const names = figures.names;
const said = document.getElementById("said");
const ROWS_AT_ONCE = 100, ROWS_WHOLE = 200, ROWS_PRINTED = 1000;
const select = (selector, root = document) => root.querySelector(selector);
const selectAll = (selector, root = document) => [...root.querySelectorAll(selector)];

function element(name, attributes = {}, ...content) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) {
    if (key === "class") made.className = value;
    else if (key in made) made[key] = value;
    else made.setAttribute(key, value);
  }
  made.append(...content);
  return made;
}

function unpacked(column) {
  return Array.isArray(column) ? column : column.text.split(column.by);
}

function counted(number) {
  return number.toLocaleString("en-GB");
}

// What is chosen: nothing, one mark, or the two or three marks of a row.
const choice = { marks: [], only: false, listeners: [] };

function choose(marks, words) {
  choice.marks = marks;
  if (!marks.length) choice.only = false;
  for (const listener of choice.listeners) listener();
  if (words) said.textContent = words;
}

function setOnly(only) {
  choice.only = only && choice.marks.length > 0;
  for (const listener of choice.listeners) listener();
}

// A row belongs to a chosen mark when it names it, and to a chosen line when it names both its ends.
function belongs(marks) {
  return choice.marks.length > 0 && (marks.length === 1
    ? choice.marks.includes(marks[0])
    : choice.marks.every((mark) => marks.includes(mark)));
}

class Table {
  constructor(name, data) {
    this.name = name;
    this.data = data;
    this.table = select(`table[data-table="${name}"]`);
    this.body = this.table.tBodies[0];
    this.tools = select(`[data-tools="${name}"]`);
    this.leaves = select(`[data-leaves="${name}"]`);
    this.flagged = new Set(data.flagged);
    this.cache = new Map();
    this.order = null;
    this.rows = null;
    this.leaf = 0;
    this.sorted = null;
    this.words = "";
    this.filters = new Map();
    this.equip();
  }

  get marks() {
    this.links ??= unpacked(this.data.marks).map((marks) => marks.split(" ").map(Number));
    return this.links;
  }

  cells(column) {
    if (!this.cache.has(column)) this.cache.set(column, this.decoded(column));
    return this.cache.get(column);
  }

  decoded(column) {
    const packed = this.data.columns[column], nature = this.data.headings[column].nature;
    if (nature === "marks") return this.marks.map((marks) => this.called(marks));
    const cells = unpacked(packed);
    if (nature === "choice") return cells.map((cell) => packed.words[cell]);
    if (nature === "source") {
      return cells.map((cell) => packed.words[cell.slice(0, cell.indexOf(":"))] + cell.slice(cell.indexOf(":")));
    }
    return cells;
  }

  called(marks) {
    const [first, second, third] = marks.map((mark) => names[mark]);
    if (third !== undefined) return `${first}: ${second} → ${third}`;
    return second === undefined ? first : `${first} → ${second}`;
  }

  equip() {
    this.tools.hidden = false;
    const columns = this.data.headings;
    selectAll("thead th", this.table).forEach((head, column) => {
      const button = element("button", { type: "button", title: head.title });
      button.append(...select(".head", head).childNodes);
      head.replaceChildren(button);
      button.addEventListener("click", () => this.sort(column));
    });
    select("[data-search]", this.tools).addEventListener("input", (event) => {
      this.words = event.target.value.trim().toLowerCase();
      this.filter();
    });
    columns.forEach((heading, column) => {
      const packed = this.data.columns[column];
      if (heading.nature === "choice" && heading.key !== "unit" && packed.words.length > 1) this.offer(heading, column, packed);
    });
    select("[data-flagged]", this.tools)?.addEventListener("change", () => this.filter());
    select("[data-worst]", this.tools).addEventListener("click", () => this.sort(null));
    select("[data-copy]", this.tools).addEventListener("click", (event) => this.copy(event.target));
    this.body.addEventListener("click", (event) => {
      const row = event.target.closest("tr");
      if (row && !String(getSelection())) this.pick(Number(row.dataset.row));
    });
    this.dress();
    if (this.data.rows > ROWS_WHOLE) this.turn(0, false);
  }

  offer(heading, column, packed) {
    const list = element("select", {}, element("option", { value: "" }, "all"));
    packed.words.forEach((word, number) => list.append(element("option", { value: String(number) }, word || "none")));
    list.addEventListener("change", () => {
      if (list.value === "") this.filters.delete(column);
      else this.filters.set(column, list.value);
      this.filter();
    });
    select("[data-choices]", this.tools).append(element("label", {}, heading.name, list));
  }

  // Names in the rows become buttons, so that the keyboard reaches them.
  dress() {
    for (const row of this.body.rows) {
      const head = row.cells[0];
      if (!select("button", head)) {
        head.replaceChildren(element("button", { type: "button", class: "pick" }, head.textContent));
      }
    }
    this.highlight();
  }

  pick(row) {
    const marks = this.marks[row];
    const same = marks.length === choice.marks.length && marks.every((mark, place) => mark === choice.marks[place]);
    choose(same ? [] : marks, same ? "Nothing chosen" : `Chosen: ${this.called(marks)}`);
  }

  highlight() {
    for (const row of this.body.rows) {
      const chosen = belongs(this.marks[row.dataset.row]);
      row.classList.toggle("chosen", chosen);
      if (chosen) row.setAttribute("aria-current", "true");
      else row.removeAttribute("aria-current");
    }
  }

  get haystack() {
    if (!this.searched) {
      const texts = this.data.headings.map((heading, column) => [heading, column])
        .filter(([heading]) => this.data.rows <= 5000 || !["number", "dms"].includes(heading.nature))
        .map(([, column]) => this.cells(column));
      this.searched = Array.from({ length: this.data.rows }, (_, row) => texts.map((cells) => cells[row]).join("\t").toLowerCase());
    }
    return this.searched;
  }

  filter() {
    const flaggedOnly = select("[data-flagged]", this.tools)?.checked;
    const filters = [...this.filters].map(([column, value]) => [unpacked(this.data.columns[column]), value]);
    const words = this.words, haystack = words ? this.haystack : null;
    const all = this.order ?? Array.from({ length: this.data.rows }, (_, row) => row);
    this.rows = all.filter((row) =>
      (!words || haystack[row].includes(words))
      && (!flaggedOnly || this.flagged.has(row))
      && (!choice.only || belongs(this.marks[row]))
      && filters.every(([cells, value]) => cells[row] === value));
    this.turn(0);
  }

  sort(column) {
    const ascending = this.sorted?.column === column && this.sorted.direction === "ascending";
    const direction = ascending ? "descending" : "ascending";
    this.sorted = column === null ? null : { column, direction };
    selectAll("thead th", this.table).forEach((head, place) => {
      if (place === column) head.setAttribute("aria-sort", direction);
      else head.removeAttribute("aria-sort");
    });
    this.order = column === null ? null : this.sortedRows(column, ascending ? -1 : 1);
    this.filter();
    const heading = this.data.headings[column]?.name;
    said.textContent = column === null ? "Worst first" : `Sorted by ${heading}, ${direction}`;
  }

  sortedRows(column, sign) {
    const keys = this.keys(column);
    const rows = Array.from({ length: this.data.rows }, (_, row) => row);
    return rows.sort((one, other) => {
      const first = keys[one], second = keys[other];
      if (Number.isNaN(first) || Number.isNaN(second)) return Number.isNaN(first) - Number.isNaN(second) || one - other;
      return sign * (first - second) || one - other;
    });
  }

  keys(column) {
    const nature = this.data.headings[column].nature, cells = this.cells(column);
    if (nature === "marks") {
      const rank = ranks(names);
      return this.marks.map((marks) => (rank[marks[0]] * names.length + rank[marks[1] ?? 0]) * names.length + rank[marks[2] ?? 0]);
    }
    if (nature === "source") {
      const files = this.data.columns[column];
      return unpacked(files).map((cell) => cell.split(/[:+]/).map(Number)).map(([file, line]) => file * 1e9 + line);
    }
    if (nature === "number" || nature === "dms") return cells.map(magnitude);
    const rank = ranks(cells);
    return rank;
  }

  turn(leaf, moved = true) {
    const rows = this.rows ?? Array.from({ length: this.data.rows }, (_, row) => row);
    const most = this.printing ? ROWS_PRINTED : this.data.rows > ROWS_WHOLE ? ROWS_AT_ONCE : this.data.rows;
    this.leaf = leaf;
    const first = this.printing ? 0 : leaf * most, last = Math.min(first + most, rows.length);
    if (moved) {
      const columns = this.data.headings.map((heading, column) => this.cells(column));
      this.body.replaceChildren(...rows.slice(first, last).map((row) => this.row(row, columns)));
      this.dress();
    }
    this.describe(rows.length, first, last, most);
  }

  row(row, columns) {
    const made = element("tr", { "data-row": row, class: this.flagged.has(row) ? "flagged" : "" });
    columns.forEach((cells, column) => {
      const numeric = ["number", "dms"].includes(this.data.headings[column].nature);
      const cell = column === 0 ? element("th", { scope: "row" }) : element("td", { class: numeric ? "c n" : "c" });
      cell.textContent = cells[row];
      made.append(cell);
    });
    return made;
  }

  describe(found, first, last, most) {
    const all = found === this.data.rows ? `${counted(found)} rows` : `${counted(found)} of ${counted(this.data.rows)} rows`;
    const shown = found > last - first ? `Rows ${counted(first + 1)} to ${counted(last)} of ${all}.` : `${all}.`;
    this.leaves.replaceChildren(element("span", {}, this.printing && last < found ? `${shown} The rest is in the files beside this page.` : shown));
    if (found > most && !this.printing) {
      const leaves = Math.ceil(found / most);
      for (const [words, to] of [["Back", this.leaf - 1], ["Next", this.leaf + 1]]) {
        const button = element("button", { type: "button", disabled: to < 0 || to >= leaves }, words);
        button.addEventListener("click", () => this.turn(to));
        this.leaves.append(button);
      }
    }
  }

  copy(button) {
    const rows = this.rows ?? Array.from({ length: this.data.rows }, (_, row) => row);
    const columns = this.data.headings.map((heading, column) => this.cells(column));
    const head = this.data.headings.map(({ name, unit }) => (unit ? `${name} [${unit}]` : name)).join("\t");
    const plain = (cell) => cell.replace(/[\t\r\n]+/g, " ");
    const text = [head, ...rows.map((row) => columns.map((cells) => plain(cells[row])).join("\t"))].join("\n") + "\n";
    copyText(text).then((copied) => {
      said.textContent = copied ? `${counted(rows.length)} rows copied` : "The browser did not let the rows be copied";
      button.textContent = copied ? "Copied" : "Not copied";
      setTimeout(() => { button.textContent = "Copy as TSV"; }, 1500);
    });
  }

  print(printing) {
    if (this.data.rows <= ROWS_WHOLE) return;
    this.printing = printing;
    this.turn(printing ? 0 : this.leaf);
  }
}

async function copyText(text) {
  try {
    await navigator.clipboard.writeText(text);
    return true;
  } catch {
    const area = element("textarea", { value: text });
    document.body.append(area);
    area.select();
    const copied = document.execCommand("copy");
    area.remove();
    return copied;
  }
}

function magnitude(cell) {
  if (!cell) return NaN;
  const parts = /^(-?)(\d+)-(\d\d)-(\d\d(?:\.\d*)?)$/.exec(cell);
  if (!parts) return Number(cell);
  return (parts[1] ? -1 : 1) * (Number(parts[2]) + Number(parts[3]) / 60 + Number(parts[4]) / 3600);
}

function ranks(words) {
  const rank = new Map();
  const collator = new Intl.Collator("en", { numeric: true });
  [...new Set(words)].sort(collator.compare).forEach((word, place) => rank.set(word, place));
  return words.map((word) => rank.get(word));
}

// What a search looks through is made ready while nothing else happens.
function whenIdle(act) {
  if ("requestIdleCallback" in window) requestIdleCallback(act, { timeout: 4000 });
  else setTimeout(act, 1500);
}

const tables = new Map();
for (const [name, data] of Object.entries(figures.tables)) {
  if (select(`table[data-table="${name}"]`)) tables.set(name, new Table(name, data));
}
choice.listeners.push(() => {
  for (const table of tables.values()) {
    if (choice.only !== Boolean(table.only)) table.filter();
    else if (choice.only) table.filter();
    else table.highlight();
    table.only = choice.only;
  }
});
for (const table of tables.values()) whenIdle(() => table.haystack);
