// A table of thousands of rows. table.py says what comes. Only the rows in view, and some above and
// below them, are in the page: they are filled anew as the table is scrolled, sorted and filtered.
// Words from files become the data of text nodes, never HTML.

const ROW = 26; // px
const SPARE = 8; // rows drawn above and below what is in view
const KEEP = 52; // px, the first column
const WIDEST = 280; // px, of a column that is as wide as its texts
const LONG = 90; // px, a line of a label that is better broken again
const ARROW = 15; // px beside a label
const PADDING = 15; // px, both sides of a cell
const SORTS = 3; // columns that count: the last clicked, then those clicked before it
const BLANK = 0xffffffff; // rank of a cell without a value
const HINT = "arrow keys move, Enter takes a row, k keeps it";
const WORDS = { "✓": "yes", "✗": "no", "–": "not known" };
let views = 0;

function read(view) {
  const { buffer, byteOffset } = view;
  const size = new DataView(buffer, byteOffset, 4).getUint32(0, true);
  const data = JSON.parse(new TextDecoder().decode(new Uint8Array(buffer, byteOffset + 4, size)));
  const [, offset, count] = data.arrays.ranks;
  const start = byteOffset + 4 + size + offset;
  const ranks = new Uint32Array(buffer.slice(start, start + 4 * count)); // a view need not be aligned
  const rows = data.keys.length;
  data.columns.forEach((column, k) => { column.ranks = ranks.subarray(k * rows, (k + 1) * rows); });
  data.numbers = new Map(data.keys.map((key, number) => [key, number]));
  const names = data.columns.findIndex((column) => column.kind !== "text");
  data.names = Math.max(1, names < 0 ? data.columns.length : names); // leading texts name the row
  return data;
}

// Capitals and ways to write the same sign are no matter in the filter.
const plain = (text) => text.normalize("NFKC").toLowerCase();

const grouped = (count) => String(count).replace(/\B(?=(\d{3})+$)/g, "\u202f");

const clamp = (value, low, high) => Math.max(low, Math.min(high, value));

function make(tag, name, parent, attributes = {}) {
  const element = document.createElement(tag);
  element.className = name;
  for (const [attribute, value] of Object.entries(attributes)) element.setAttribute(attribute, value);
  parent.append(element);
  return element;
}

// The least width in which words of these widths, set one after the other, take so many lines
function narrowest(words, gap, lines) {
  const linesAt = (width) => {
    let [count, end] = [1, -gap];
    for (const word of words) {
      if (end + gap + word > width && end > 0) [count, end] = [count + 1, word];
      else end += gap + word;
    }
    return count;
  };
  let width = Math.max(...words);
  while (linesAt(width) > lines) width += 2;
  return width + 1;
}

function textIn(parent) {
  const node = document.createTextNode("");
  parent.append(node);
  return node;
}

function put(node, text) { if (node.data !== text) node.data = text; }

const isCut = (cell) => cell.scrollWidth > cell.clientWidth;

function set(element, attribute, text) {
  if (text) element.setAttribute(attribute, text);
  else element.removeAttribute(attribute);
}

class TableView {
  constructor(model, el, kept) {
    this.model = model;
    this.kept = kept; // outlives this view
    // sorts: {key, down}, the last clicked first; row: key of the focused one, "" in the heading
    this.state = { sorts: [], words: "", onlyMet: false, top: 0, left: 0, row: null, column: 1, ...kept };
    this.id = `explorer-table-${views += 1}`;
    this.rows = []; // those in the page, from top to bottom
    this.first = 0; // place of the first of them
    this.order = []; // numbers of the rows that fit the filter, as sorted
    this.stamp = 0;
    this.shown = 0;
    this.build(el);
    this.listen();
    this.take();
  }

  build(el) {
    this.root = make("div", "explorer-table", el);
    this.root.style.setProperty("--t-height", `${ROW}px`);
    const bar = make("div", "t-bar", this.root);
    this.filter = make("input", "t-filter", bar, {
      type: "search", placeholder: "filter: words, e.g. 'diamond NA 0.9'", autocomplete: "off", spellcheck: "false",
      "aria-label": "Filter: only candidates in which every word occurs",
    });
    this.filter.value = this.state.words;
    this.onlyMet = make("button", "t-met-only", bar, { type: "button", "aria-pressed": String(this.state.onlyMet) });
    this.onlyMet.textContent = "only what meets everything";
    this.count = textIn(make("span", "t-count", bar, { role: "status" }));
    make("span", "t-keys", bar, { id: `${this.id}-keys` }).textContent = HINT;
    this.grid = make("div", "t-grid", this.root, { role: "grid", tabindex: "0", "aria-describedby": `${this.id}-keys` });
    this.head = make("div", "t-head", this.grid, { role: "row", "aria-rowindex": "1" });
    this.body = make("div", "t-body", this.grid); // as high as all rows
    this.window = make("div", "t-window", this.body); // what of them is in the page
    this.none = make("p", "t-none", this.root);
    this.note = make("div", "t-note", this.root, { "aria-hidden": "true" });
    this.none.hidden = this.note.hidden = true;
    this.none.textContent = "No candidate fits the filter.";
  }

  listen() {
    const { model } = this;
    this.stop = new AbortController();
    this.on(this.filter, "input", () => this.refilter({ words: this.filter.value }));
    this.on(this.onlyMet, "click", () => this.refilter({ onlyMet: !this.state.onlyMet }));
    this.listenToGrid();
    this.take = this.take.bind(this);
    this.mark = () => { this.stamp += 1; this.slide(); };
    model.on("change:packed", this.take);
    model.on("change:current", this.mark);
    this.sizes = new ResizeObserver(() => this.resize());
    this.sizes.observe(this.grid);
    this.sizes.observe(this.head);
  }

  on(target, kind, run) { target.addEventListener(kind, run, { signal: this.stop.signal }); }

  listenToGrid() {
    const { grid, note, state } = this;
    this.on(grid, "scroll", () => {
      if (grid.scrollTop === state.top && grid.scrollLeft === state.left) return; // our own doing
      note.hidden = true;
      this.slide();
    });
    this.on(grid, "keydown", (event) => this.key(event));
    this.on(grid, "focus", () => { if (!this.pressed) this.focusStart(); });
    this.on(grid, "blur", () => { note.hidden = true; });
    this.on(grid, "pointerdown", (event) => {
      note.hidden = true;
      this.pressed = true; // a row must not move away under the finger
      if (!event.target.closest("button")) return;
      event.preventDefault(); // the grid takes the focus, not a button of a row that is filled anew
      grid.focus({ preventScroll: true });
    });
    for (const kind of ["pointerup", "pointercancel"]) this.on(window, kind, () => { this.pressed = false; });
    this.on(grid, "click", (event) => this.click(event.target));
    this.on(grid, "pointerover", ({ target }) => { // what is cut off is told on hover
      if (target.matches(".t-row > .t-text") && !target.title && isCut(target)) target.title = target.firstChild.data;
    });
  }

  destroy() {
    Object.assign(this.kept, this.state);
    this.stop.abort();
    this.sizes.disconnect();
    this.model.off("change:packed", this.take);
    this.model.off("change:current", this.mark);
    this.root.remove();
  }

  // -------------------------------------------------------------- what is shown

  take() {
    const packed = this.model.get("packed");
    if (!packed?.byteLength) return;
    const before = this.data;
    this.data = read(packed);
    const headings = ({ columns }) => JSON.stringify(columns.map(({ key, label, kind, tooltip }) => [key, label, kind, tooltip]));
    this.stamp += 1;
    this.grid.setAttribute("aria-label", this.data.description);
    if (!before || headings(before) !== headings(this.data)) this.buildColumns();
    this.arrange();
    this.font = ""; // widths are for these texts
    this.measure();
    this.slide();
    this.root.dataset.shown = String(this.shown += 1);
  }

  buildColumns() {
    for (const row of this.rows) row.element.remove();
    this.rows = [];
    this.at = undefined;
    this.head.replaceChildren();
    const keep = make("div", "t-title t-first", this.head, { role: "columnheader" });
    make("span", "t-hidden", keep).textContent = "keep";
    this.headings = [keep];
    this.data.columns.forEach((column, k) => {
      const cell = make("div", `t-cell t-title t-${column.kind}${k ? "" : " t-name"}`, this.head, { role: "columnheader" });
      make("span", "t-label", cell).textContent = column.label;
      make("span", "t-arrow", cell, { "aria-hidden": "true" });
      set(cell, "title", column.tooltip);
      this.headings.push(cell);
    });
    this.state.column = clamp(this.state.column, 0, this.data.columns.length);
    this.paintSorts();
  }

  makeRow() {
    const element = make("div", "t-row", this.window, { role: "row" });
    const keep = make("div", "t-cell t-first", element, { role: "gridcell" });
    const button = make("button", "t-keep", keep, { type: "button", tabindex: "-1" });
    button.textContent = "keep";
    const cells = [keep];
    const texts = [];
    this.data.columns.forEach((column, k) => {
      const role = k < this.data.names ? "rowheader" : "gridcell";
      const cell = make("div", `t-cell t-${column.kind}${k ? "" : " t-name"}`, element, { role });
      const mark = column.kind === "pass" ? textIn(make("span", "t-mark", cell, { "aria-hidden": "true" })) : null;
      texts.push({ mark, text: textIn(mark ? make("span", "t-hidden", cell) : cell) });
      cells.push(cell);
    });
    const met = make("span", "t-hidden", cells[1]);
    return { element, button, cells, texts, met };
  }

  // Fill a row of the page with what belongs at a place of the order.
  fill(row, place) {
    const { data, model } = this;
    const number = this.order[place];
    if (row.place !== place) {
      row.element.setAttribute("aria-rowindex", String(place + 2));
      row.place = place;
    }
    if (row.number === number && row.stamp === this.stamp) return;
    Object.assign(row, { number, stamp: this.stamp });
    const tone = data.tones[number];
    row.element.className = tone ? `t-row t-${tone}` : "t-row";
    row.element.setAttribute("aria-selected", String(data.keys[number] === model.get("current")));
    row.met.textContent = tone === "met" ? ", meets everything" : "";
    row.button.setAttribute("aria-label", `keep ${this.nameOf(number)}`);
    data.columns.forEach((column, k) => {
      const { mark, text } = row.texts[k];
      const cell = row.cells[k + 1];
      put(text, column.texts[number]);
      if (mark) {
        put(mark, column.marks[number]);
        cell.dataset.mark = mark.data;
        if (!text.data) put(text, WORDS[mark.data]);
      }
      const title = column.titles?.[number] ?? "";
      if (cell.title !== title) set(cell, "title", title);
    });
  }

  nameOf(number) { return this.data.columns.slice(0, this.data.names).map((column) => column.texts[number]).join(", "); }

  // Put the rows of the page where the table is scrolled to; rows that stay in view stay as they are.
  slide() {
    const { grid, order, rows, state } = this;
    if (!this.data || !grid.clientHeight) return; // not in the page, or folded away
    if (!this.placed) {
      this.placed = true;
      [grid.scrollTop, grid.scrollLeft] = [state.top, state.left];
    }
    [state.top, state.left] = [grid.scrollTop, grid.scrollLeft];
    grid.classList.toggle("t-scrolled", state.left > KEEP);
    const wanted = Math.min(Math.ceil(grid.clientHeight / ROW) + 2 * SPARE, order.length);
    while (rows.length > wanted) rows.pop().element.remove();
    while (rows.length < wanted) rows.push(this.makeRow());
    const first = clamp(Math.floor(state.top / ROW) - SPARE, 0, order.length - wanted);
    this.rotate(first - this.first);
    this.first = first;
    this.window.style.top = `${first * ROW}px`; // moving every row by itself took three times as long
    rows.forEach((row, k) => this.fill(row, first + k));
    this.paintFocus();
  }

  // Rows that leave at one end come in at the other, in the page too: it is read in that order.
  rotate(by) {
    const { rows, window: part } = this;
    if (by === 0 || Math.abs(by) >= rows.length) return;
    const moved = by > 0 ? rows.splice(0, by) : rows.splice(by);
    const elements = moved.map((row) => row.element);
    if (by > 0) { rows.push(...moved); part.append(...elements); }
    else { rows.unshift(...moved); part.prepend(...elements); }
  }

  // -------------------------------------------------------------- size

  resize() {
    if (!this.grid.clientHeight) { this.placed = false; return; } // browsers forget where it was scrolled to
    const font = getComputedStyle(this.grid).font; // the page's style may come after the table
    if (font !== this.font) this.measure();
    this.slide();
  }

  measure() {
    if (!this.data || !this.grid.clientHeight) return;
    this.font = getComputedStyle(this.grid).font;
    this.pen ??= document.createElement("canvas").getContext("2d");
    const widths = this.data.columns.map((column) => column.width ?? this.widthOf(column));
    const tracks = this.data.columns.map(({ width }, k) => (width === null ? `minmax(${widths[k]}px, ${widths[k]}fr)` : `${width}px`));
    this.root.style.setProperty("--t-columns", `${KEEP}px ${tracks.join(" ")}`);
    this.root.style.setProperty("--t-least", `${widths.reduce((sum, width) => sum + width, KEEP)}px`);
  }

  // As wide as the longest text and as the label in two lines, or in three where those are long
  widthOf({ texts, label, kind }) {
    const { pen } = this;
    pen.font = this.font;
    const longest = kind === "pass" ? "✓" : texts.reduce((long, text) => (text.length > long.length ? text : long), "");
    const wide = 1.03 * pen.measureText(longest).width;
    pen.font = this.font.replace(/^(normal |400 )?/, "600 ");
    const words = label.split(" ").map((word) => pen.measureText(word).width);
    const gap = pen.measureText(" ").width;
    const two = narrowest(words, gap, 2);
    const heading = (two > LONG ? narrowest(words, gap, 3) : two) + ARROW;
    return Math.ceil(clamp(Math.max(wide, heading) + PADDING, 40, WIDEST));
  }

  // -------------------------------------------------------------- order and filter

  arrange() {
    const { data, state } = this;
    const fits = this.fitting();
    this.order = data.keys.map((_, number) => number).filter(fits).sort(this.comparing());
    this.places = new Map(this.order.map((number, place) => [number, place]));
    this.body.style.height = `${this.order.length * ROW}px`;
    this.grid.setAttribute("aria-rowcount", String(this.order.length + 1));
    const [some, all] = [this.order.length, data.keys.length].map(grouped);
    put(this.count, `${some} of ${all} candidate${data.keys.length === 1 ? "" : "s"}`);
    this.none.hidden = this.order.length > 0 || !(state.words.trim() || state.onlyMet);
  }

  fitting() {
    const { data, state } = this;
    const words = plain(state.words).split(/\s+/).filter(Boolean);
    const searched = data.columns.filter(({ kind }) => kind !== "number"); // digits occur in most numbers
    if (words.length) data.whole ??= data.keys.map((_, number) => plain(searched.map((column) => column.texts[number]).join("\n")));
    return (number) => (!state.onlyMet || data.tones[number] === "met") && words.every((word) => data.whole[number].includes(word));
  }

  comparing() {
    const ranked = this.state.sorts.flatMap(({ key, down }) => {
      const column = this.data.columns.find((one) => one.key === key);
      return column ? [{ ranks: column.ranks, sign: down ? -1 : 1 }] : [];
    });
    return (a, b) => {
      for (const { ranks, sign } of ranked) {
        const [x, y] = [ranks[a], ranks[b]];
        if (x === y) continue;
        if (x === BLANK || y === BLANK) return x === BLANK ? 1 : -1;
        return sign * (x - y);
      }
      return a - b;
    };
  }

  refilter(change) {
    Object.assign(this.state, change);
    this.onlyMet.setAttribute("aria-pressed", String(this.state.onlyMet));
    if (!this.data) return;
    this.arrange();
    this.grid.scrollTop = 0;
    this.slide();
  }

  sortBy({ key, first_descending: highest }) {
    const last = this.lastSort();
    const down = last?.key === key ? !last.down : highest;
    this.state.sorts = [{ key, down }, ...this.state.sorts.filter((sort) => sort.key !== key)].slice(0, SORTS);
    this.arrange();
    this.paintSorts();
    this.grid.scrollTop = 0;
    this.slide();
  }

  // The last clicked column of those that are shown
  lastSort() { return this.state.sorts.find((sort) => this.data.columns.some(({ key }) => key === sort.key)); }

  paintSorts() {
    const last = this.lastSort();
    this.data.columns.forEach(({ key }, k) => {
      const sorted = last?.key === key;
      this.headings[k + 1].setAttribute("aria-sort", sorted ? (last.down ? "descending" : "ascending") : "none");
      this.headings[k + 1].lastChild.textContent = sorted ? (last.down ? "▼" : "▲") : "";
    });
  }

  // -------------------------------------------------------------- focus, keys, clicks

  // Place of the focused row: -1 in the heading, undefined where there is none among those that fit.
  place() {
    const { row } = this.state;
    return row === "" ? -1 : this.places.get(this.data.numbers.get(row));
  }

  firstInView() { return Math.min(Math.ceil(this.grid.scrollTop / ROW), this.order.length - 1); }

  rowRoom() { return this.grid.clientHeight - this.head.offsetHeight; }

  focusStart() {
    if (!this.data || this.place() !== undefined) return;
    const current = this.places.get(this.data.numbers.get(this.model.get("current")));
    this.focusOn(current ?? this.firstInView());
  }

  // A place of the order; below 0 the heading.
  focusOn(place, column = this.state.column) {
    this.state.row = place < 0 ? "" : this.data.keys[this.order[place]];
    this.state.column = column;
    this.reveal(place, column);
    this.slide();
  }

  reveal(place, column) {
    const { grid } = this;
    const top = place * ROW;
    if (place >= 0 && top < grid.scrollTop) grid.scrollTop = top;
    if (place >= 0 && top + ROW > grid.scrollTop + this.rowRoom()) grid.scrollTop = top + ROW - this.rowRoom();
    const [cell, name] = [this.headings[column], this.headings[1]];
    const sticky = getComputedStyle(name).position === "sticky" ? name.offsetWidth : 0;
    if (column === 0) grid.scrollLeft = 0;
    if (column === 0 || (column === 1 && sticky)) return;
    const left = cell.offsetLeft;
    if (left - sticky < grid.scrollLeft) grid.scrollLeft = left - sticky;
    else if (left + cell.offsetWidth > grid.scrollLeft + grid.clientWidth) grid.scrollLeft = left + cell.offsetWidth - grid.clientWidth;
  }

  paintFocus() {
    if (!this.data) return;
    const place = this.place();
    const cells = place === -1 ? this.headings : this.rows[place - this.first]?.cells;
    const cell = cells?.[this.state.column];
    if (cell !== this.at) {
      this.at?.classList.remove("t-at");
      this.at?.parentElement.removeAttribute("data-at");
      this.at?.removeAttribute("id");
      this.at = cell;
      cell?.classList.add("t-at");
      cell?.parentElement.setAttribute("data-at", "");
      if (cell) cell.id = `${this.id}-at`;
    }
    set(this.grid, "aria-activedescendant", cell?.id);
  }

  key(event) {
    const { key } = event;
    if (event.metaKey || event.altKey || (event.ctrlKey && key !== "Home" && key !== "End") || !this.data) return;
    const page = Math.max(1, Math.floor(this.rowRoom() / ROW) - 1);
    const down = { ArrowUp: -1, ArrowDown: 1, PageUp: -page, PageDown: page, Home: -Infinity, End: Infinity }[key];
    const right = { ArrowLeft: -1, ArrowRight: 1 }[key];
    if (down) this.move(down);
    else if (right) this.focusOn(this.place() ?? this.firstInView(), clamp(this.state.column + right, 0, this.data.columns.length));
    else if (key === "Enter") this.act();
    else if (key === "k") this.tell("keep");
    else if (key === "Escape" && !this.note.hidden) this.note.hidden = true;
    else return;
    if (down || right) this.showNote();
    event.preventDefault();
    event.stopPropagation(); // a notebook moves its selection with the same keys
  }

  move(by) {
    const from = this.place();
    const last = this.order.length - 1;
    if (from === undefined) this.focusOn(Number.isFinite(by) ? this.firstInView() : by < 0 ? 0 : last);
    else if (from === -1 && by === 1) this.focusOn(this.firstInView());
    else if (by === -1) this.focusOn(Math.max(-1, from - 1));
    else this.focusOn(clamp(from + by, Math.min(0, last), last));
  }

  act() {
    const { column } = this.state;
    if (this.place() === -1) { if (column > 0) this.sortBy(this.data.columns[column - 1]); }
    else this.tell(column === 0 ? "keep" : "pick");
  }

  click(target) {
    const cell = target.closest("[role=columnheader], [role=gridcell], [role=rowheader]");
    const row = this.rows.find(({ element }) => element.contains(cell));
    if (row) {
      this.focusOn(row.place, row.cells.indexOf(cell));
      this.tell(target.closest("button") ? "keep" : "pick");
    } else if (cell && this.headings.indexOf(cell) > 0) {
      this.focusOn(-1, this.headings.indexOf(cell));
      this.act();
    }
  }

  tell(kind) {
    if (this.place() >= 0) this.model.send({ kind, key: this.state.row });
  }

  // Tooltips are for the mouse: what the focused cell has to say stands beside it too.
  showNote() {
    const { at, note, root } = this;
    const cut = at?.matches(".t-row > .t-text") && isCut(at);
    note.textContent = at?.title || (cut ? at.firstChild.data : "");
    note.hidden = !note.textContent;
    if (note.hidden) return;
    const [box, frame] = [at.getBoundingClientRect(), root.getBoundingClientRect()];
    const below = box.bottom - frame.top + 2;
    const top = below + note.offsetHeight < root.clientHeight ? below : box.top - frame.top - note.offsetHeight - 2;
    note.style.top = `${top}px`;
    note.style.left = `${clamp(box.left - frame.left, 0, root.clientWidth - note.offsetWidth)}px`;
  }
}

// Once a widget: what is kept comes back when the table is taken from the page and put there again.
export default () => {
  const kept = {};
  return {
    render({ model, el }) {
      const view = new TableView(model, el, kept);
      return () => view.destroy();
    },
  };
};
