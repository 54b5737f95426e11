// The map canvas: colours, axes, lines, marks, labels, legend, readout and the design point.
// canvas.py describes the message. Four layers lie on each other, so that a moved point redraws
// the ring alone: the cells (stretched by the browser), the axes and the legend around them, the
// ink over them, and the point.

const FONT = '"Noto Sans", "Liberation Sans", Arial, "DejaVu Sans", sans-serif';
const KINDS = { float32: Float32Array, uint32: Uint32Array, uint8: Uint8Array };
const COLOURS = 1024;
const MARK_REACH = 12; // px around a mark that count as the mark
const HIDDEN = "position:absolute;width:1px;height:1px;overflow:hidden;clip-path:inset(50%);margin:0;padding:0";

// Any of these can be set on the page as a CSS variable, --explorer-<name>; --explorer-scheme: dark
// chooses the second set. `scale` is a list of colours from "less" to "more".
// Where none is set, the page's own colours are taken.
const PAGE_NAMES = { paper: "paper", ink: "ink", muted: "quiet", rule: "rule", red: "red", "amber-ink": "amber" };
const THEMES = {
  light: {
    paper: "#fbfaf6", ink: "#12222b", muted: "#55626a", rule: "#d9d5c9", amber: "#c8842a",
    "amber-ink": "#774200", red: "#c0392b",
    scale: "#f5f2ea, #cfe3d8, #9accbf, #5fb0aa, #338f93, #1f6f80, #1a526b, #153a50",
    categories: "#dfe9df, #79b7ad, #1f6f80, #e3b57c, #8c96b5, #c9c3b4, #153a50, #a9744f",
  },
  dark: {
    paper: "#12191d", ink: "#e9eef0", muted: "#a3b1b8", rule: "#3a464d", amber: "#d99a4e",
    "amber-ink": "#f2c78f", red: "#ff7d69",
    scale: "#17242b, #1b3c4b, #1d576a, #277682, #43958f, #75b5a1, #a9d0bb, #dcefe4",
    categories: "#2b3a40, #43958f, #a9d0bb, #c58a45, #7c88ad, #6d6a60, #dcefe4, #a9744f",
  },
};

// ---------------------------------------------------------------- message

function unpack(view) {
  const { buffer, byteOffset, byteLength } = view;
  const size = new DataView(buffer, byteOffset, 4).getUint32(0, true);
  const words = new Uint8Array(buffer, byteOffset + 4, size);
  const picture = JSON.parse(new TextDecoder().decode(words));
  let start = byteOffset + 4 + size;
  let bytes = buffer;
  if (start % 4) { // a view into a larger message need not be aligned
    bytes = buffer.slice(start, byteOffset + byteLength);
    start = 0;
  }
  picture.data = {};
  for (const [name, [kind, offset, count]] of Object.entries(picture.arrays)) {
    picture.data[name] = new KINDS[kind](bytes, start + offset, count);
  }
  for (const name of ["cautioned", "holds"]) {
    if (picture.data[name]) picture.data[name] = fromPlanes(picture.data[name], picture.data.values.length);
  }
  return picture;
}

// Planes of bits, low bit first, to one number a cell
function fromPlanes(planes, count) {
  const cells = new Uint8Array(count);
  const size = Math.ceil(count / 8);
  for (let plane = 0; plane * size < planes.length; plane++) {
    for (let byte = 0; byte < size; byte++) {
      const bits = planes[plane * size + byte];
      if (bits === 0) continue;
      for (let bit = 0; bit < 8; bit++) if (bits >> bit & 1) cells[8 * byte + bit] |= 1 << plane;
    }
  }
  return cells;
}

// ---------------------------------------------------------------- numbers as people write them

const SUPERSCRIPTS = { "-": "⁻", 0: "⁰", 1: "¹", 2: "²", 3: "³", 4: "⁴", 5: "⁵", 6: "⁶", 7: "⁷", 8: "⁸", 9: "⁹" };
const PREFIXES = { "-5": "f", "-4": "p", "-3": "n", "-2": "µ", "-1": "m", 0: "", 1: "k", 2: "M", 3: "G", 4: "T", 5: "P" };
const PREFIXED = new Set(["1/s", "/s", "Hz", "s", "m", "W", "J", "eV"]);

const minus = (text) => text.replace("-", "−");
const powerOfTen = (exponent) => "10" + [...String(exponent)].map((c) => SUPERSCRIPTS[c]).join("");

function plainNumber(value, digits = 3) {
  if (value === 0) return "0";
  const rounded = Number(value.toPrecision(digits));
  const exponent = Math.floor(Math.log10(Math.abs(rounded)) + 1e-12);
  if (exponent >= 6 || exponent < -3) {
    const factor = Number((rounded / 10 ** exponent).toPrecision(digits));
    return factor === 1 ? powerOfTen(exponent) : `${minus(String(factor))}×${powerOfTen(exponent)}`;
  }
  return minus(String(rounded));
}

// [number, unit as written], with an SI prefix where the unit takes one
function numberAndUnit(value, unit, digits = 3) {
  const rate = unit === "1/s" || unit === "/s";
  const written = rate ? "/s" : unit === "1" ? "" : unit;
  if (!PREFIXED.has(unit) || value === 0) return [plainNumber(value, digits), written];
  const rounded = Number(value.toPrecision(digits));
  const step = Math.floor(Math.log10(Math.abs(rounded)) / 3 + 1e-12);
  // "m/s" would be read as metres a second
  if (!(step in PREFIXES) || (rate && step < 0)) return [plainNumber(value, digits), written];
  const scaled = Number((rounded / 1000 ** step).toPrecision(digits));
  return [minus(String(scaled)), PREFIXES[step] + written];
}

function withUnit(value, unit, digits = 3) {
  if (!Number.isFinite(value)) return value === Infinity ? "∞" : value === -Infinity ? "−∞" : "no number";
  const [number, written] = numberAndUnit(value, unit, digits);
  return written === "" ? number : /^[°%]/.test(written) ? number + written.replace("%", " %") : `${number} ${written}`;
}

// ---------------------------------------------------------------- scales and ticks

const fractionOf = (scale, value) => scale.log
  ? Math.log(value / scale.low) / Math.log(scale.high / scale.low)
  : (value - scale.low) / (scale.high - scale.low);

const valueAt = (scale, fraction) => scale.log
  ? scale.low * (scale.high / scale.low) ** fraction
  : scale.low + fraction * (scale.high - scale.low);

const clamped = (fraction) => Math.max(0, Math.min(1, fraction));

const axisTitle = (axis) => (axis.unit && axis.unit !== "1" ? `${axis.label}, ${axis.unit}` : axis.label);

// [{fraction, value, text}], at most `room` of them; `write` turns a value into text
function ticksOf(scale, room, write) {
  const values = scale.log ? logTicks(scale, room) : linearTicks(scale, room);
  const text = write ?? tickWriter(scale, values);
  return values.map((value) => ({ value, fraction: fractionOf(scale, value), text: text(value) }));
}

function logTicks({ low, high }, room) {
  const [first, last] = [Math.ceil(Math.log10(low) - 1e-9), Math.floor(Math.log10(high) + 1e-9)];
  const count = last - first + 1;
  if (count >= 3) {
    const every = Math.max(1, Math.ceil(count / Math.max(2, room)));
    const values = [];
    for (let e = Math.ceil(first / every) * every; e <= last; e += every) values.push(10 ** e);
    return values;
  }
  if (high / low < 3) return linearTicks({ low, high }, room);
  const factors = room >= 3 * Math.max(1, count) ? [1, 2, 5] : [1, 3];
  const values = [];
  for (let e = first - 1; e <= last; e++) for (const f of factors) values.push(Number(`${f}e${e}`));
  return values.filter((v) => v >= low * (1 - 1e-9) && v <= high * (1 + 1e-9));
}

function linearTicks({ low, high }, room) {
  const [start, end] = [Math.min(low, high), Math.max(low, high)];
  const raw = (end - start) / Math.max(2, room);
  const decade = 10 ** Math.floor(Math.log10(raw));
  const step = [1, 2, 5, 10].map((f) => f * decade).find((s) => s >= raw * (1 - 1e-9));
  const values = [];
  for (let i = Math.ceil(start / step - 1e-9); i <= end / step + 1e-9; i++) values.push(Number((i * step).toPrecision(12)));
  return values;
}

function tickWriter(scale, values) {
  const decades = scale.log && values.length > 1 && values.every((v) => Math.abs(Math.log10(v) % 1) < 1e-9);
  if (decades) return (value) => minus(powerOfTen(Math.round(Math.log10(value))));
  return (value) => plainNumber(value, 6);
}

// ---------------------------------------------------------------- colour

function channels(colour) {
  const hex = colour.trim().replace("#", "");
  const full = hex.length === 3 ? [...hex].map((c) => c + c).join("") : hex;
  return [0, 2, 4].map((i) => parseInt(full.slice(i, i + 2), 16));
}

const toLinear = (c) => (c /= 255, c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4);
const fromLinear = (c) => Math.round(255 * Math.min(1, Math.max(0, c <= 0.0031308 ? 12.92 * c : 1.055 * c ** (1 / 2.4) - 0.055)));

// Oklab: equal steps look equal
function oklab(colour) {
  const [r, g, b] = channels(colour).map(toLinear);
  const l = Math.cbrt(0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b);
  const m = Math.cbrt(0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b);
  const s = Math.cbrt(0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b);
  return [
    0.2104542553 * l + 0.793617785 * m - 0.0040720468 * s,
    1.9779984951 * l - 2.428592205 * m + 0.4505937099 * s,
    0.0259040371 * l + 0.7827717662 * m - 0.808675766 * s,
  ];
}

function fromOklab([L, A, B]) {
  const l = (L + 0.3963377774 * A + 0.2158037573 * B) ** 3;
  const m = (L - 0.1055613458 * A - 0.0638541728 * B) ** 3;
  const s = (L - 0.0894841775 * A - 1.291485548 * B) ** 3;
  return [
    4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s,
    -1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s,
    -0.0041960863 * l - 0.7034186147 * m + 1.707614701 * s,
  ].map(fromLinear);
}

const pixel = ([r, g, b]) => (255 << 24 | b << 16 | g << 8 | r) >>> 0; // little-endian RGBA

// The anchors give hue and chroma; lightness runs evenly from the first to the last
function colourTable(anchors) {
  const labs = anchors.map(oklab);
  const [first, last] = [labs[0][0], labs[labs.length - 1][0]];
  return Uint32Array.from({ length: COLOURS }, (_, i) => {
    const lightness = first + (last - first) * i / (COLOURS - 1);
    let k = 0;
    while (k < labs.length - 2 && (labs[k + 1][0] - lightness) * (last - first) < 0) k++;
    const part = Math.min(1, Math.max(0, (lightness - labs[k][0]) / (labs[k + 1][0] - labs[k][0])));
    return pixel(fromOklab([lightness, ...[1, 2].map((j) => labs[k][j] + part * (labs[k + 1][j] - labs[k][j]))]));
  });
}

function readTheme(element) {
  const style = getComputedStyle(element);
  const given = (name) => style.getPropertyValue(`--${name}`).trim();
  const defaults = THEMES[given("explorer-scheme") === "dark" ? "dark" : "light"];
  const hex = (text) => (/^#[0-9a-f]{3,8}\b/i.test(text) ? text : "");
  return Object.fromEntries(Object.entries(defaults).map(([name, value]) =>
    [name, hex(given(`explorer-${name}`)) || hex(given(PAGE_NAMES[name] ?? "")) || value]));
}

const css = (word) => `rgb(${word & 255},${word >> 8 & 255},${word >> 16 & 255})`;

function faded(colour, alpha) {
  const [r, g, b] = channels(colour);
  return `rgba(${r},${g},${b},${alpha})`;
}

// ---------------------------------------------------------------- cells

// A mask of the cells without a number, or null where all have one
function withoutNumber(values) {
  let mask = null;
  for (let i = 0; i < values.length; i++) {
    if (values[i] !== values[i]) (mask ??= new Uint8Array(values.length))[i] = 1;
  }
  return mask;
}

// The colour of a positive number under a logarithmic scale, by the leading bits of its float32
// form: exponent and 9 digits of the mantissa, finer than the colours. No logarithm a cell.
function logColours({ low, high }, table) {
  const word = new Uint32Array(1);
  const number = new Float32Array(word.buffer);
  const key = (value) => (number[0] = value, word[0] >>> 14);
  const first = key(low);
  const colours = new Uint32Array(key(high) - first + 1);
  const gain = (COLOURS - 1) / Math.log(high / low);
  for (let k = 0; k < colours.length; k++) {
    word[0] = (first + k << 14) + (1 << 13);
    colours[k] = table[Math.max(0, Math.min(COLOURS - 1, Math.round(Math.log(number[0] / low) * gain)))];
  }
  return { first, colours };
}

function logPixels({ values }, { first, colours }, put) {
  const words = new Uint32Array(values.buffer, values.byteOffset, values.length);
  const last = colours.length - 1;
  put((i) => {
    const word = words[i];
    if ((word & 0x7fffffff) > 0x7f800000) return 0; // NaN: the paper shows
    const k = (word >>> 14) - first;
    return colours[word >>> 31 || k < 0 ? 0 : k > last ? last : k];
  });
}

function linearPixels({ values }, { low, high }, table, put) {
  const gain = (COLOURS - 1) / (high - low || 1);
  put((i) => {
    const value = values[i];
    if (value !== value) return 0;
    const place = (value - low) * gain + 0.5;
    return table[place > 0 ? (place < COLOURS ? place | 0 : COLOURS - 1) : 0];
  });
}

function cellPixels(picture, theme, pixels) {
  const { data, colour } = picture;
  const [ny, nx] = picture.shape;
  const put = (colourOf) => {
    for (let row = 0; row < ny; row++) {
      let out = (ny - 1 - row) * nx; // row 0 is the lowest y, the last on the screen
      for (let i = row * nx, end = i + nx; i < end; i++) pixels[out++] = colourOf(i);
    }
  };
  const flat = colour.categories.map((_, code) => pixel(channels(theme.categories[code % theme.categories.length])));
  if (flat.length) put((i) => flat[data.values[i]] ?? 0);
  else if (colour.log) logPixels(data, logColours(colour, theme.table), put);
  else linearPixels(data, colour, theme.table, put);
}

// Indices of the points that a path needs to stay within an eighth of a pixel of its course.
// Iso-lines come with a point a cell, and stroking them all costs more than the rest of a redraw.
function cornersOf(xs, ys) {
  const kept = xs.length ? [0] : [];
  let anchor = 0;
  for (let i = 2; i < xs.length; i++) {
    const [dx, dy] = [xs[i] - xs[anchor], ys[i] - ys[anchor]];
    const limit = 0.12 * Math.hypot(dx, dy);
    let straight = i - anchor < 40;
    for (let k = anchor + 1; straight && k < i; k++) {
      straight = Math.abs(dx * (ys[k] - ys[anchor]) - dy * (xs[k] - xs[anchor])) <= limit;
    }
    if (!straight) kept.push(anchor = i - 1);
  }
  if (xs.length > 1) kept.push(xs.length - 1);
  return kept;
}

// ---------------------------------------------------------------- labels that don't collide

class Places {
  constructor(bounds) { this.bounds = bounds; this.taken = []; }
  take(box) { this.taken.push(box); }
  inside(box) {
    const b = this.bounds;
    return box.x >= b.x && box.y >= b.y && box.x + box.w <= b.x + b.w && box.y + box.h <= b.y + b.h;
  }
  touches(a, b) {
    const air = 3;
    return a.x < b.x + b.w + air && b.x < a.x + a.w + air && a.y < b.y + b.h + air && b.y < a.y + a.h + air;
  }
  free(box) { return this.inside(box) && !this.taken.some((other) => this.touches(box, other)); }
  // the first free candidate; `always` takes one beside the ring at least if none is free
  choose(candidates, always = false) {
    const box = candidates.find((c) => this.free(c)) ?? (always ? this.forced(candidates) : undefined);
    if (box) this.take(box);
    return box;
  }
  forced(candidates) {
    const b = this.bounds;
    const inside = candidates.filter((c) => this.inside(c));
    const box = inside.find((c) => !this.touches(c, this.ring)) ?? inside[0] ?? candidates[0];
    const within = (at, size, start, room) => Math.max(start, Math.min(start + room - size, at));
    return { ...box, x: within(box.x, box.w, b.x, b.w), y: within(box.y, box.h, b.y, b.h) };
  }
}

// right, left, above, below, then the diagonals of a place
function around(x, y, w, h, gap) {
  const [right, left, above, below] = [x + gap, x - gap - w, y - gap - h, y + gap];
  const [centre, middle] = [x - w / 2, y - h / 2];
  return [[right, middle], [left, middle], [centre, above], [centre, below], [right, above], [right, below], [left, above], [left, below]]
    .map(([bx, by]) => ({ x: bx, y: by, w, h }));
}

// ---------------------------------------------------------------- the view

function make(tag, style, parent, attributes = {}) {
  const element = document.createElement(tag);
  element.style.cssText = style;
  for (const [name, value] of Object.entries(attributes)) element.setAttribute(name, value);
  parent.appendChild(element);
  return element;
}

class MapView {
  constructor(model, el) {
    this.model = model;
    this.frame = 0;
    this.widths = new Map();
    this.build(el);
    this.drag = null;
    this.sent = model.get("move_done");
    this.point = model.get("point");
    this.undo = [];
    this.listen();
    this.readTheme();
    this.takePicture();
    this.describe();
  }

  build(el) {
    const fill = "position:absolute;left:0;top:0;";
    this.host = make("div", "position:relative;width:100%;height:100%;min-height:20rem;overflow:hidden", el, { class: "explorer-map" });
    this.image = make("div", `${fill}width:100%;height:100%`, this.host, { role: "img" });
    this.clip = make("div", "position:absolute;overflow:hidden", this.image);
    this.cells = make("canvas", "position:absolute", this.clip);
    this.around = make("canvas", fill, this.image);
    this.ink = make("canvas", fill, this.image);
    this.top = make("canvas", fill, this.image);
    this.surface = make("div", "position:absolute;cursor:crosshair;touch-action:none;outline:none", this.host, {
      role: "slider", tabindex: "0", "aria-label": "Design point: arrow keys move it, with Shift in larger steps",
      "aria-valuemin": "0", "aria-valuemax": "100", "aria-valuenow": "50",
    });
    this.readout = make("div", `position:absolute;pointer-events:none;visibility:hidden;left:0;top:0;white-space:nowrap;padding:5px 9px;border-radius:4px;line-height:1.35;font-family:${FONT}`, this.host, { "aria-hidden": "true" });
    this.list = make("ul", HIDDEN, this.host, { "aria-label": "Marks on the map" });
  }

  on(target, name, handler, options) {
    target.addEventListener(name, handler, options);
    this.undo.push(() => target.removeEventListener(name, handler, options));
  }

  listen() {
    const { model, surface } = this;
    const follow = (name, handler) => {
      model.on(name, handler);
      this.undo.push(() => model.off(name, handler));
    };
    follow("change:packed", () => this.takePicture());
    follow("change:point", () => this.adoptPoint());
    follow("change:move_done", () => this.adoptPoint());
    follow("change:proposal", () => { if (this.picture) this.paintPoint(); });
    follow("change:description", () => this.describe());
    this.on(surface, "pointerdown", (event) => this.press(event));
    this.on(surface, "pointermove", (event) => this.pointerMoves(event));
    for (const name of ["pointerup", "pointercancel", "lostpointercapture"]) this.on(surface, name, () => this.release());
    this.on(surface, "pointerleave", () => this.hideReadout());
    this.on(surface, "keydown", (event) => this.key(event));
    this.on(surface, "focus", () => { if (!this.pressing && surface.matches(":focus-visible")) this.showFocus(); });
    this.on(surface, "blur", () => { surface.style.outline = "none"; this.hideReadout(); });
    this.observe();
  }

  observe() {
    const size = new ResizeObserver(() => this.resize());
    size.observe(this.host);
    const theme = new MutationObserver(() => this.changeTheme());
    const options = { attributes: true, attributeFilter: ["class", "style", "data-theme", "data-jp-theme-light"] };
    for (const element of [document.documentElement, document.body]) theme.observe(element, options);
    theme.observe(document.head, { childList: true }); // style sheets that come late
    const dark = matchMedia("(prefers-color-scheme: dark)");
    this.on(dark, "change", () => this.changeTheme());
    this.undo.push(() => { size.disconnect(); theme.disconnect(); this.unwatchRatio(); });
    this.watchRatio();
  }

  // A query of the present pixel ratio tells of its end (zoom, another screen) once
  watchRatio() {
    const query = matchMedia(`(resolution: ${devicePixelRatio}dppx)`);
    const changed = () => { this.watchRatio(); this.redraw(); };
    query.addEventListener("change", changed, { once: true });
    this.unwatchRatio = () => query.removeEventListener("change", changed);
  }

  destroy() {
    for (const step of this.undo) step();
    clearTimeout(this.settling);
    cancelAnimationFrame(this.waiting);
    this.host.remove();
  }

  // True where the colours are new
  readTheme() {
    const theme = readTheme(this.host);
    const key = Object.values(theme).join();
    if (key === this.theme?.key) return false;
    const categories = theme.categories.split(",").map((colour) => colour.trim());
    this.theme = { ...theme, key, categories, table: colourTable(theme.scale.split(",")) };
    const { style } = this.readout;
    style.background = theme.paper;
    style.color = theme.ink;
    style.border = `1px solid ${theme.ink}`;
    this.clip.style.background = theme.paper; // seen where there is no number
    return true;
  }

  changeTheme() { if (this.readTheme()) this.redraw(); }

  describe() { this.image.setAttribute("aria-label", this.model.get("description")); }

  // -------------------------------------------------------------- when to draw

  takePicture() {
    const packed = this.model.get("packed");
    if (!packed || !packed.byteLength) return;
    this.picture = unpack(packed);
    this.picture.noNumber = withoutNumber(this.picture.data.values);
    this.listMarks();
    // A first picture of a frame is drawn at once, further ones wait for the next frame
    if (this.waiting) { this.late = true; return; }
    this.waiting = requestAnimationFrame(() => {
      this.waiting = 0;
      if (this.late) { this.late = false; this.redraw(); }
    });
    this.redraw();
  }

  resize() {
    const { clientWidth, clientHeight } = this.host;
    const recoloured = this.readTheme(); // the page's style may arrive after the canvas
    if (recoloured || clientWidth !== this.width || clientHeight !== this.height) this.redraw();
  }

  redraw() {
    const { clientWidth, clientHeight } = this.host;
    if (!this.picture || clientWidth < 80 || clientHeight < 80) return;
    this.measureLayout(clientWidth, clientHeight);
    this.paintCells();
    this.paintAround();
    this.paintInk();
    this.paintPoint();
    this.host.dataset.frame = String(++this.frame);
  }

  // -------------------------------------------------------------- layout

  textWidth(text, size = this.size, weight = 400) {
    const key = `${weight} ${size} ${text}`;
    if (!this.widths.has(key)) {
      if (this.widths.size > 2000) this.widths.clear();
      const pen = this.ink.getContext("2d");
      pen.font = `${weight} ${size}px ${FONT}`;
      this.widths.set(key, pen.measureText(text).width);
    }
    return this.widths.get(key);
  }

  shows(layer) { return this.picture.layers[layer] !== false; }

  measureLayout(width, height) {
    const { x, y, top, right } = this.picture;
    this.fitCanvases(width, height);
    const size = this.size = Math.round(Math.max(14, Math.min(18, Math.min(width, height) / 48)));
    const line = this.line = Math.round(size * 1.35);
    const scales = this.shows("scales");
    this.second = { top: scales ? top : null, right: scales ? right : null };
    const above = this.second.top ? 12 + line * (top.label ? 2 : 1) : Math.ceil(line / 2) + 2;
    this.legendRows = this.planLegend(width);
    const below = 10 + 2 * line + 8 + this.legendRows.height;
    const tall = height - above - below;
    this.yTicks = ticksOf(y, Math.max(2, Math.floor(tall / (line * 1.6))));
    const left = line + 12 + Math.ceil(Math.max(...this.yTicks.map((tick) => this.textWidth(tick.text)), 0)) + 8;
    const beside = this.second.right
      ? 14 + Math.ceil(Math.max(...right.ticks.map(([, text]) => this.textWidth(text)), 0)) + (right.label ? line + 4 : 0)
      : 16;
    const wide = width - left - beside;
    const label = Math.max(...ticksOf(x, 4).map((tick) => this.textWidth(tick.text)));
    this.xTicks = ticksOf(x, Math.max(2, Math.floor(wide / (label + size * 1.5))));
    const overhang = (this.xTicks.at(-1)?.fraction ?? 0) > 0.97 ? this.textWidth(this.xTicks.at(-1).text) / 2 + 2 : 0;
    const side = Math.max(beside, Math.ceil(overhang));
    this.plot = { x: left, y: above, w: Math.max(40, width - left - side), h: Math.max(40, tall) };
    this.placeLayers();
  }

  fitCanvases(width, height) {
    const ratio = devicePixelRatio || 1;
    if (width === this.width && height === this.height && ratio === this.ratio) return;
    Object.assign(this, { width, height, ratio });
    this.widths.clear();
    this.aroundKey = "";
    for (const canvas of [this.around, this.ink, this.top]) {
      canvas.width = Math.round(width * ratio);
      canvas.height = Math.round(height * ratio);
      canvas.style.width = `${width}px`;
      canvas.style.height = `${height}px`;
    }
  }

  placeLayers() {
    const { plot, picture, cells } = this;
    const [ny, nx] = picture.shape;
    for (const { style } of [this.clip, this.surface]) {
      Object.assign(style, { left: `${plot.x}px`, top: `${plot.y}px`, width: `${plot.w}px`, height: `${plot.h}px` });
    }
    // With samples at both ends the outermost cells reach half a cell over the border
    const over = (n, room) => (picture.ends_included && n > 1 ? room / (n - 1) / 2 : 0);
    this.bleed = { x: over(nx, plot.w), y: over(ny, plot.h) };
    Object.assign(cells.style, {
      left: `${-this.bleed.x}px`, top: `${-this.bleed.y}px`,
      width: `${plot.w + 2 * this.bleed.x}px`, height: `${plot.h + 2 * this.bleed.y}px`,
      imageRendering: picture.colour.categories.length ? "pixelated" : "auto",
    });
  }

  toX(fraction) { return this.plot.x + fraction * this.plot.w; }
  toY(fraction) { return this.plot.y + (1 - fraction) * this.plot.h; }

  pen(canvas) {
    const pen = canvas.getContext("2d");
    pen.setTransform(this.ratio, 0, 0, this.ratio, 0, 0);
    pen.clearRect(0, 0, this.width, this.height);
    pen.lineJoin = pen.lineCap = "round";
    return pen;
  }

  // -------------------------------------------------------------- cells and hatching

  paintCells() {
    const { picture, cells } = this;
    const [ny, nx] = picture.shape;
    if (cells.width !== nx || cells.height !== ny || !this.pixels) {
      cells.width = nx;
      cells.height = ny;
      this.pixels = new ImageData(nx, ny);
    }
    cellPixels(picture, this.theme, new Uint32Array(this.pixels.data.buffer));
    cells.getContext("2d").putImageData(this.pixels, 0, 0);
  }

  // Diagonals in fractions of the plot, cut where the cells are not marked. Composing masks of
  // pixels looks the same and took five times as long.
  hatchRuns(marked, spacing, rising) {
    const { plot, picture } = this;
    const [ny, nx] = picture.shape;
    const step = Math.max(1.5, Math.min(plot.w / nx, plot.h / ny));
    const spread = picture.ends_included ? [nx - 1, ny - 1, 0.5] : [nx, ny, 0];
    const [gainX, gainY, shift] = [spread[0] / plot.w, spread[1] / plot.h, spread[2]];
    const runs = [];
    for (let at = -plot.h + spacing / 2; at < plot.w; at += spacing) {
      const end = Math.min(plot.h, plot.w - at);
      let start = -1;
      for (let t = Math.max(0, -at); t <= end; t += step) {
        const column = Math.min(nx - 1, (at + t) * gainX + shift | 0);
        const row = Math.min(ny - 1, (rising ? t : plot.h - t) * gainY + shift | 0);
        if (marked[row * nx + column]) { if (start < 0) start = t; }
        else if (start >= 0) { runs.push(at, start, t); start = -1; }
      }
      if (start >= 0) runs.push(at, start, end);
    }
    return runs;
  }

  hatch(pen, marked, spacing, rising, strokes) {
    const runs = this.hatchRuns(marked, spacing, rising);
    const { plot } = this;
    const toY = (t) => (rising ? plot.y + plot.h - t : plot.y + t);
    pen.lineCap = "butt";
    for (const { colour, width, shift } of strokes) {
      pen.beginPath();
      for (let i = 0; i < runs.length; i += 3) {
        const x = plot.x + runs[i] + shift;
        pen.moveTo(x + runs[i + 1], toY(runs[i + 1]));
        pen.lineTo(x + runs[i + 2], toY(runs[i + 2]));
      }
      Object.assign(pen, { strokeStyle: colour, lineWidth: width });
      pen.stroke();
    }
    pen.lineCap = "round";
  }

  paintHatching(pen) {
    const { picture, theme } = this;
    if (picture.noNumber) {
      this.hatch(pen, picture.noNumber, 16, false, [{ colour: faded(theme.muted, 0.6), width: 1.5, shift: 0 }]);
    }
    if (picture.data.cautioned && this.shows("hatching")) {
      const { noNumber, data: { cautioned } } = picture;
      const marked = noNumber ? cautioned.map((bits, i) => (noNumber[i] ? 0 : bits)) : cautioned;
      this.hatch(pen, marked, 11, true, [
        { colour: faded(theme.paper, 0.5), width: 1.5, shift: 2 },
        { colour: faded(theme.ink, 0.6), width: 1.5, shift: 0 },
      ]);
    }
  }

  // -------------------------------------------------------------- ink over the cells

  paintInk() {
    const { picture, plot } = this;
    const pen = this.pen(this.ink);
    this.places = new Places({ x: plot.x + 2, y: plot.y + 2, w: plot.w - 4, h: plot.h - 4 });
    pen.save();
    pen.beginPath();
    pen.rect(plot.x, plot.y, plot.w, plot.h);
    pen.clip();
    this.paintHatching(pen);
    const bands = picture.bands.filter((band) => (band.own || this.shows("bands")) && band.low < 1 && band.high > 0);
    for (const band of bands) this.paintBand(pen, band);
    this.paintLines(pen);
    pen.restore();
    pen.strokeStyle = this.theme.ink;
    pen.lineWidth = 1.5;
    pen.strokeRect(plot.x, plot.y, plot.w, plot.h);
    this.paintLabels(pen, bands);
  }

  // Axes and legend stay as they are in most pictures; drawing text is dear
  paintAround() {
    const { x, y, colour } = this.picture;
    const key = JSON.stringify([x, y, colour, this.second, this.plot, this.legendRows, this.theme.key]);
    if (key === this.aroundKey) return;
    this.aroundKey = key;
    const pen = this.pen(this.around);
    this.paintAxes(pen);
    this.paintSecondScales(pen);
    this.paintLegend(pen);
  }

  paintBand(pen, band) {
    const { plot, theme } = this;
    const [top, bottom] = [this.toY(Math.min(1, band.high)), this.toY(Math.max(0, band.low))];
    pen.fillStyle = faded(theme.amber, band.own ? 0.24 : 0.12);
    pen.fillRect(plot.x, top, plot.w, Math.max(2, bottom - top));
    pen.strokeStyle = faded(theme.amber, band.own ? 1 : 0.7);
    pen.lineWidth = 2;
    pen.beginPath();
    for (const y of [top, Math.max(top + 2, bottom)]) { pen.moveTo(plot.x, y); pen.lineTo(plot.x + plot.w, y); }
    pen.stroke();
  }

  trace(pen, line) {
    const { points, starts } = this.picture.data;
    pen.beginPath();
    for (let path = line.first; path < line.first + line.count; path++) {
      const [first, end] = [starts[path], starts[path + 1]];
      const xs = [], ys = [];
      for (let i = first; i < end; i++) { xs.push(this.toX(points[2 * i])); ys.push(this.toY(points[2 * i + 1])); }
      cornersOf(xs, ys).forEach((i, k) => (k ? pen.lineTo(xs[i], ys[i]) : pen.moveTo(xs[i], ys[i])));
    }
  }

  // Where the region that meets everything touches the border, the border closes the outline
  traceBorder(pen) {
    const { holds } = this.picture.data;
    if (!holds) return;
    const [ny, nx] = this.picture.shape;
    const { plot } = this;
    const edge = (count, cellOf, x0, y0, x1, y1) => {
      const at = (k) => Math.max(0, Math.min(1, this.picture.ends_included ? (k - 0.5) / (count - 1) : k / count));
      for (let k = 0; k < count; k++) {
        if (!holds[cellOf(k)]) continue;
        const start = k;
        while (k < count && holds[cellOf(k)]) k++;
        pen.moveTo(x0 + (x1 - x0) * at(start), y0 + (y1 - y0) * at(start));
        pen.lineTo(x0 + (x1 - x0) * at(k), y0 + (y1 - y0) * at(k));
      }
    };
    const [l, r, t, b] = [plot.x + 1.5, plot.x + plot.w - 1.5, plot.y + 1.5, plot.y + plot.h - 1.5];
    if (nx < 2 || ny < 2) return;
    edge(nx, (k) => k, l, b, r, b);
    edge(nx, (k) => (ny - 1) * nx + k, l, t, r, t);
    edge(ny, (k) => k * nx, l, b, l, t);
    edge(ny, (k) => k * nx + nx - 1, r, b, r, t);
  }

  paintLines(pen) {
    const { theme, picture } = this;
    const stroke = (colour, width) => { pen.strokeStyle = colour; pen.lineWidth = width; pen.stroke(); };
    const ofKind = (kind, layer) => (this.shows(layer) ? picture.lines.filter((line) => line.kind === kind) : []);
    for (const line of ofKind("iso", "iso")) {
      this.trace(pen, line);
      stroke(this.isoColour(line.level), 2);
    }
    for (const line of ofKind("frontier", "frontiers")) {
      this.trace(pen, line);
      stroke(faded(theme.paper, 0.75), 4);
      pen.setLineDash([8, 6]);
      stroke(theme.ink, 2);
      pen.setLineDash([]);
    }
    const outlines = ofKind("outline", "outline");
    for (const [colour, width] of [[theme.paper, 6], [theme.red, 3]]) {
      for (const line of outlines) { this.trace(pen, line); stroke(colour, width); }
      if (this.shows("outline")) { pen.beginPath(); this.traceBorder(pen); stroke(colour, width); }
    }
    for (const line of outlines) this.keepClearOf(line);
  }

  // On an iso-line the map has the colour of its level: ink on light, paper on dark
  isoColour(level) {
    const { theme, picture } = this;
    if (level === null) return faded(theme.ink, 0.5);
    const place = Math.max(0, Math.min(1, fractionOf(picture.colour, level))) * (COLOURS - 1);
    const word = theme.table[Math.round(place)];
    const light = (r, g, b) => 0.2126 * toLinear(r) + 0.7152 * toLinear(g) + 0.0722 * toLinear(b);
    const ground = light(word & 255, word >> 8 & 255, word >> 16 & 255);
    const contrast = (colour) => {
      const other = light(...channels(colour));
      return (Math.max(ground, other) + 0.05) / (Math.min(ground, other) + 0.05);
    };
    return contrast(theme.ink) > contrast(theme.paper) ? faded(theme.ink, 0.6) : faded(theme.paper, 0.75);
  }

  keepClearOf(line) {
    const { points, starts } = this.picture.data;
    for (let path = line.first; path < line.first + line.count; path++) {
      let [px, py] = [NaN, NaN];
      for (let i = starts[path]; i < starts[path + 1]; i++) {
        const [x, y] = [this.toX(points[2 * i]), this.toY(points[2 * i + 1])];
        const steps = Number.isNaN(px) ? 1 : Math.max(1, Math.ceil(Math.hypot(x - px, y - py) / 10));
        if (!Number.isNaN(px) && Math.hypot(x - px, y - py) < 8 && i < starts[path + 1] - 1) continue;
        for (let s = 1; s <= steps; s++) {
          const part = s / steps;
          const at = Number.isNaN(px) ? [x, y] : [px + part * (x - px), py + part * (y - py)];
          this.places.take({ x: at[0] - 4, y: at[1] - 4, w: 8, h: 8 });
        }
        [px, py] = [x, y];
      }
    }
  }

  // -------------------------------------------------------------- axes

  write(pen, text, x, y, { colour = this.theme.ink, align = "left", weight = 400, size = this.size } = {}) {
    pen.font = `${weight} ${size}px ${FONT}`;
    pen.fillStyle = colour;
    pen.textAlign = align;
    pen.textBaseline = "middle";
    pen.fillText(text, x, y);
  }

  writeTurned(pen, text, x, y, turn, options) {
    pen.save();
    pen.translate(x, y);
    pen.rotate(turn * Math.PI / 2);
    this.write(pen, text, 0, 0, { align: "center", ...options });
    pen.restore();
  }

  tickMarks(pen, places, colour) {
    pen.strokeStyle = colour;
    pen.lineWidth = 1.5;
    pen.beginPath();
    for (const [x, y, dx, dy] of places) { pen.moveTo(x, y); pen.lineTo(x + dx, y + dy); }
    pen.stroke();
  }

  fitted(text, room, options = {}) {
    if (this.textWidth(text, this.size, options.weight) <= room) return text;
    let kept = text.length;
    while (kept > 1 && this.textWidth(text.slice(0, kept) + "…", this.size, options.weight) > room) kept--;
    return text.slice(0, kept) + "…";
  }

  paintAxes(pen) {
    const { plot, theme, line, picture } = this;
    const bottom = plot.y + plot.h;
    this.tickMarks(pen, this.xTicks.map((tick) => [this.toX(tick.fraction), bottom, 0, 6]), theme.ink);
    this.tickMarks(pen, this.yTicks.map((tick) => [plot.x, this.toY(tick.fraction), -6, 0]), theme.ink);
    for (const tick of this.xTicks) this.write(pen, tick.text, this.toX(tick.fraction), bottom + 8 + line / 2, { align: "center" });
    for (const tick of this.yTicks) this.write(pen, tick.text, plot.x - 9, this.toY(tick.fraction), { align: "right" });
    const room = Math.min(this.width - 8, plot.w + plot.x);
    this.write(pen, this.fitted(axisTitle(picture.x), room), plot.x + plot.w / 2, bottom + 8 + line * 1.5 + 2, { align: "center" });
    this.writeTurned(pen, this.fitted(axisTitle(picture.y), plot.h + 20), line / 2 + 2, plot.y + plot.h / 2, -1);
  }

  // Ticks of a second scale, those that would touch the one before left out
  thinned(ticks, toPlace, sizeOf, gap) {
    let end = -Infinity;
    return ticks.filter(([fraction]) => fraction >= -1e-9 && fraction <= 1 + 1e-9)
      .map(([fraction, text]) => ({ at: toPlace(fraction), text, half: sizeOf(text) / 2 }))
      .sort((a, b) => a.at - b.at)
      .filter(({ at, half }) => at - half >= end + gap && ((end = at + half), true));
  }

  paintSecondScales(pen) {
    const { plot, theme, line } = this;
    const { top, right } = this.second;
    if (top) {
      const ticks = this.thinned(top.ticks, (f) => this.toX(f), (text) => this.textWidth(text), 10);
      this.tickMarks(pen, ticks.map(({ at }) => [at, plot.y, 0, -6]), theme.muted);
      for (const { at, text } of ticks) this.write(pen, text, at, plot.y - 8 - line / 2, { align: "center", colour: theme.muted });
      this.write(pen, this.fitted(top.label, plot.w), plot.x, line / 2 + 2, { colour: theme.muted });
    }
    if (right) {
      const edge = plot.x + plot.w;
      const ticks = this.thinned(right.ticks, (f) => this.toY(f), () => this.size, 4);
      this.tickMarks(pen, ticks.map(({ at }) => [edge, at, 6, 0]), theme.muted);
      for (const { at, text } of ticks) this.write(pen, text, edge + 10, at, { colour: theme.muted });
      this.writeTurned(pen, this.fitted(right.label, plot.h + 20), this.width - line / 2, plot.y + plot.h / 2, 1, { colour: theme.muted });
    }
  }

  // -------------------------------------------------------------- legend

  // Swatches that the legend needs beside the colours; their width decides how the rows break
  planLegend(width) {
    const { colour, data, noNumber } = this.picture;
    const items = colour.categories.map((text, code) => ({ text, fill: this.theme.categories[code % this.theme.categories.length] }));
    if (noNumber) items.push({ text: "no number", hatch: "none" });
    if (data.cautioned && this.shows("hatching")) items.push({ text: "caution", hatch: "caution" });
    for (const item of items) item.width = 22 + 7 + this.textWidth(item.text);
    const keys = items.reduce((sum, item) => sum + item.width + 16, 0);
    const bar = colour.categories.length ? null : { width: 0 };
    const indent = 60;
    const rows = [[]];
    let used = bar ? Math.max(0, width - indent - keys - 16) < 200 ? Infinity : 0 : 0;
    for (const item of items) {
      if (used === Infinity || (used && used + item.width > width - indent)) { rows.push([]); used = 0; }
      rows[rows.length - 1].push(item);
      used += item.width + 16;
    }
    const first = bar ? 10 + this.line + 2 : this.line;
    return { rows, bar, keys, height: first + (rows.length - 1) * this.line };
  }

  paintLegend(pen) {
    const { plot, line, legendRows: { rows, bar, height } } = this;
    const top = this.height - height;
    const widthOf = (row) => row.reduce((sum, item) => sum + item.width + 16, 0);
    let y = top;
    rows.forEach((row, number) => {
      let x = plot.x;
      if (number === 0 && bar) {
        const room = plot.w - widthOf(row) - (row.length ? 20 : 0);
        const wide = Math.max(120, Math.min(420, room));
        this.paintBar(pen, x, y, wide);
        x += wide + 28;
      }
      for (const item of row) {
        this.paintSwatch(pen, item, x, y + (number === 0 && bar ? 10 + line / 2 : line / 2));
        x += item.width + 16;
      }
      y += number === 0 && bar ? 12 + line : line;
    });
  }

  paintBar(pen, x, y, wide) {
    const { theme, line } = this;
    const { colour } = this.picture;
    const gradient = pen.createLinearGradient(x, 0, x + wide, 0);
    for (let i = 0; i <= 16; i++) gradient.addColorStop(i / 16, css(theme.table[Math.round(i / 16 * (COLOURS - 1))]));
    pen.fillStyle = gradient;
    pen.fillRect(x, y, wide, 9);
    pen.strokeStyle = theme.muted;
    pen.lineWidth = 1;
    pen.strokeRect(x + 0.5, y + 0.5, wide - 1, 8);
    const ticks = ticksOf(colour, 6, (value) => withUnit(value, colour.unit));
    const ends = [0, 1].map((fraction) => {
      const value = valueAt(colour, fraction);
      return { fraction, text: withUnit(value, colour.unit) };
    });
    const inner = ticks.filter(({ fraction }) => fraction > 0.02 && fraction < 0.98);
    let taken = [];
    for (const { fraction, text } of [...ends, ...inner]) {
      const width = this.textWidth(text);
      const at = x + fraction * wide;
      const start = Math.max(x, Math.min(x + wide - width, at - width / 2));
      if (taken.some(([from, to]) => start < to + 10 && start + width > from - 10)) continue;
      taken.push([start, start + width]);
      if (fraction > 0 && fraction < 1) this.tickMarks(pen, [[at, y + 9, 0, 3]], theme.muted);
      this.write(pen, text, start, y + 12 + line / 2);
    }
  }

  paintSwatch(pen, { text, fill, hatch }, x, y) {
    const { theme } = this;
    const box = [x, y - 7, 22, 14];
    pen.save();
    pen.beginPath();
    pen.rect(...box);
    pen.fillStyle = fill ?? (hatch === "caution" ? css(theme.table[COLOURS >> 2]) : theme.paper);
    pen.fill();
    pen.clip();
    if (hatch) {
      pen.beginPath();
      const [spacing, rising] = hatch === "caution" ? [8, true] : [9, false];
      for (let at = x - 14; at < x + 22; at += spacing) {
        pen.moveTo(at, rising ? y + 7 : y - 7);
        pen.lineTo(at + 14, rising ? y - 7 : y + 7);
      }
      pen.strokeStyle = hatch === "caution" ? theme.ink : theme.muted;
      pen.lineWidth = 1.5;
      pen.stroke();
    }
    pen.restore();
    pen.strokeStyle = theme.muted;
    pen.lineWidth = 1;
    pen.strokeRect(...box);
    this.write(pen, text, x + 29, y);
  }

  // -------------------------------------------------------------- labels and marks

  paintLabels(pen, bands) {
    const { picture, places, plot, theme } = this;
    const marks = this.visibleMarks();
    const [px, py] = this.ringPlace();
    this.settledAt = [px, py];
    places.ring = { x: px - 17, y: py - 17, w: 34, h: 34 };
    places.take(places.ring);
    for (const [x, y] of marks.map((mark) => [this.toX(mark.x), this.toY(mark.y)])) places.take({ x: x - 8, y: y - 8, w: 16, h: 16 });
    if (this.shows("outline")) {
      for (const label of picture.labels) {
        const candidates = this.boxesAround(label.text, this.toX(label.x), this.toY(label.y), 12, 600);
        this.tag(pen, label.text, places.choose(candidates, true), { colour: theme.red, weight: 600 });
      }
    }
    const bandTag = (band) => {
      const box = places.choose(this.bandPlaces(band), band.own);
      this.tag(pen, band.text, box, { colour: theme["amber-ink"], weight: 600 });
    };
    bands.filter((band) => band.own).forEach(bandTag);
    for (const mark of marks) {
      this.paintMark(pen, mark);
      this.tag(pen, mark.text, places.choose(this.markPlaces(mark, marks), mark.own));
    }
    bands.filter((band) => !band.own).forEach(bandTag);
    for (const line of picture.lines) {
      if (!line.text || line.kind === "outline" || !this.shows(line.kind === "iso" ? "iso" : "frontiers")) continue;
      this.tag(pen, line.text, places.choose(this.placesAlong(line)), { weight: line.kind === "iso" ? 600 : 400 });
    }
  }

  visibleMarks() {
    const { marks } = this.picture;
    return this.shows("marks") ? marks.filter(({ x, y }) => x >= 0 && x <= 1 && y >= 0 && y <= 1) : [];
  }

  boxOf(text, weight = 400) { return [this.textWidth(text, this.size, weight) + 8, this.size + 6]; }

  boxesAround(text, x, y, gap, weight) {
    const [w, h] = this.boxOf(text, weight);
    return [...around(x, y, w, h, gap), ...around(x, y, w, h, gap * 1.7)];
  }

  // A name must lie nearer to its own mark than to any other
  markPlaces(mark, marks) {
    const distance = (box, { x, y }) => {
      const [mx, my] = [this.toX(x), this.toY(y)];
      return Math.hypot(Math.max(box.x - mx, 0, mx - box.x - box.w), Math.max(box.y - my, 0, my - box.y - box.h));
    };
    return this.boxesAround(mark.text, this.toX(mark.x), this.toY(mark.y), 12)
      .filter((box) => marks.every((other) => other === mark || distance(box, other) > distance(box, mark)));
  }

  bandPlaces(band) {
    const { plot } = this;
    const [w, h] = this.boxOf(band.text, 600);
    const [low, high] = [Math.max(0, band.low), Math.min(1, band.high)];
    const middle = this.toY((low + high) / 2) - h / 2;
    const within = Math.max(plot.y + 2, Math.min(plot.y + plot.h - h - 2, middle));
    const columns = [1, 0.75, 0.5, 0.25, 0].map((part) => plot.x + 4 + part * (plot.w - w - 8));
    return [within, this.toY(high) - h - 2, this.toY(low) + 2].flatMap((y) => columns.map((x) => ({ x, y, w, h })));
  }

  placesAlong(line) {
    const { points, starts } = this.picture.data;
    const [w, h] = this.boxOf(line.text, line.kind === "iso" ? 600 : 400);
    const candidates = [];
    for (let path = line.first; path < line.first + line.count; path++) {
      const count = starts[path + 1] - starts[path];
      for (const part of [0.5, 0.4, 0.6, 0.3, 0.7, 0.2, 0.8, 0.1, 0.9]) {
        const i = starts[path] + Math.floor(part * (count - 1));
        candidates.push({ x: this.toX(points[2 * i]) - w / 2, y: this.toY(points[2 * i + 1]) - h / 2, w, h });
      }
    }
    return candidates;
  }

  // Text on a small piece of paper, legible on every colour
  tag(pen, text, box, options = {}) {
    if (!box || !text) return;
    pen.fillStyle = faded(this.theme.paper, 0.93);
    pen.beginPath();
    pen.roundRect(box.x, box.y, box.w, box.h, 4);
    pen.fill();
    this.write(pen, text, box.x + 4, box.y + box.h / 2 + 0.5, options);
  }

  paintMark(pen, mark) {
    const [x, y] = [this.toX(mark.x), this.toY(mark.y)];
    pen.beginPath();
    if (mark.own) {
      pen.arc(x, y, 6, 0, 2 * Math.PI);
    } else {
      pen.moveTo(x, y - 7);
      pen.lineTo(x + 7, y + 5.5);
      pen.lineTo(x - 7, y + 5.5);
    }
    pen.closePath();
    pen.strokeStyle = mark.own ? this.theme.paper : this.theme.ink;
    pen.fillStyle = mark.own ? this.theme.ink : this.theme.paper;
    pen.lineWidth = 2;
    pen.fill();
    pen.stroke();
  }

  // -------------------------------------------------------------- the design point

  ringPlace() { return [0, 1].map((k) => clamped(this.point[k])).map((f, k) => (k ? this.toY(f) : this.toX(f))); }

  pointIsOutside() { return this.point.some((fraction) => fraction < 0 || fraction > 1); }

  paintPoint() {
    if (!this.plot) return;
    const { theme, plot } = this;
    const pen = this.pen(this.top);
    const [x, y] = this.ringPlace();
    const stroke = (colour, width) => { pen.strokeStyle = colour; pen.lineWidth = width; pen.stroke(); };
    this.paintProposal(pen, x, y, stroke);
    pen.lineCap = "butt";
    pen.beginPath();
    pen.moveTo(plot.x, y);
    pen.lineTo(x - 13, y);
    pen.moveTo(x, plot.y + plot.h);
    pen.lineTo(x, y + 13);
    stroke(faded(theme.paper, 0.6), 3);
    pen.setLineDash([3, 5]);
    stroke(theme.red, 2);
    pen.setLineDash([]);
    pen.beginPath();
    pen.arc(x, y, 10, 0, 2 * Math.PI);
    stroke(theme.paper, 7.5);
    if (this.pointIsOutside()) pen.setLineDash([4, 4]); // it waits at the border
    stroke(theme.red, 3.5);
    pen.setLineDash([]);
    pen.beginPath();
    pen.arc(x, y, 4.2, 0, 2 * Math.PI);
    pen.fillStyle = theme.red;
    pen.fill();
    stroke(theme.paper, 1.5);
    this.tellPoint();
  }

  // A design that is not taken yet: the way to it, its place, and the others it was chosen from
  paintProposal(pen, x, y, stroke) {
    const { place, path, text } = this.model.get("proposal");
    this.host.dataset.proposal = place ? place.map((fraction) => fraction.toFixed(6)).join() : "";
    if (!place) return;
    const { theme, plot } = this;
    const at = ([fx, fy]) => [this.toX(clamped(fx)), this.toY(clamped(fy))];
    const [px, py] = at(place);
    if (path?.length > 1) {
      for (const [colour, width] of [[theme.paper, 6], [theme.ink, 2.5]]) {
        pen.beginPath();
        for (const step of path) pen.lineTo(...at(step));
        stroke(colour, width);
      }
    }
    const far = Math.hypot(px - x, py - y);
    if (far > 26) {
      const [ux, uy] = [(px - x) / far, (py - y) / far];
      for (const [colour, width] of [[theme.paper, 5], [theme.red, 2.5]]) {
        pen.beginPath();
        pen.moveTo(x + 13 * ux, y + 13 * uy);
        pen.lineTo(px - 11 * ux, py - 11 * uy);
        stroke(colour, width);
      }
    }
    const side = 9; // a square on its corner: not yet the design
    pen.beginPath();
    for (const [dx, dy] of [[0, -side], [side, 0], [0, side], [-side, 0]]) pen.lineTo(px + dx, py + dy);
    pen.closePath();
    pen.fillStyle = theme.paper;
    pen.fill();
    stroke(theme.paper, 7);
    stroke(theme.red, 3);
    if (!text) return;
    const wide = this.textWidth(text, this.size, 600) + 8;
    const room = { left: px - 16 - wide > plot.x, right: px + 16 + wide < plot.x + plot.w };
    const others = path?.length > 1 ? path.map((step) => at(step)[0]) : [x]; // not on the side of these
    const middle = others.reduce((sum, one) => sum + one, 0) / others.length;
    const left = room.left && (middle > px || !room.right) ? px - 16 - wide : px + 16;
    this.tag(pen, text, { x: left, y: py - 11, w: wide, h: 22 }, { weight: 600, colour: theme.red });
  }

  tellPoint() {
    const [fx, fy] = this.point;
    this.host.dataset.point = `${fx.toFixed(6)},${fy.toFixed(6)}`;
    const { surface } = this;
    surface.setAttribute("aria-valuenow", String(Math.round(100 * Math.max(0, Math.min(1, fx)))));
    surface.setAttribute("aria-valuetext", this.readingAt(fx, fy).join(", "));
    clearTimeout(this.settling);
    this.settling = setTimeout(() => this.settle(), 150);
  }

  // Labels make room for the ring once it rests
  settle() {
    const [x, y] = this.ringPlace();
    if (this.drag || !this.plot || Math.hypot(x - this.settledAt[0], y - this.settledAt[1]) < 1) return;
    this.paintInk();
  }

  adoptPoint() {
    if (this.drag || this.model.get("move_done") < this.sent) return; // an echo of an older move
    const point = this.model.get("point");
    if (point[0] === this.point[0] && point[1] === this.point[1]) return;
    this.point = point;
    if (this.picture) this.paintPoint();
  }

  movePoint(fx, fy) {
    // A hand that keeps its height or its column leaves that input alone, also beyond the border
    const point = [fx, fy].map((fraction, k) => (Math.abs(clamped(fraction) - clamped(this.point[k])) < 1e-9 ? this.point[k] : clamped(fraction)));
    if (point[0] === this.point[0] && point[1] === this.point[1]) return;
    this.point = point;
    this.paintPoint();
    this.sent = Math.max(this.sent, this.model.get("move_sent")) + 1;
    // The widget protocol keeps one message in flight and sends the last value after it
    this.model.set("move_sent", this.sent);
    this.model.set("point", point);
    this.model.save_changes();
  }

  // -------------------------------------------------------------- pointer and keys

  placeOf(event) {
    const box = this.surface.getBoundingClientRect();
    const scale = this.plot.w / box.width || 1; // a page may be shown scaled
    return [(event.clientX - box.left) * scale + this.plot.x, (event.clientY - box.top) * scale + this.plot.y];
  }

  fractions(x, y) { return [(x - this.plot.x) / this.plot.w, 1 - (y - this.plot.y) / this.plot.h]; }

  markAt(x, y) {
    const distance = (mark) => Math.hypot(this.toX(mark.x) - x, this.toY(mark.y) - y);
    const near = this.visibleMarks().filter((mark) => distance(mark) <= MARK_REACH);
    return near.sort((a, b) => distance(a) - distance(b))[0];
  }

  press(event) {
    if (event.button !== 0 || !this.plot) return;
    event.preventDefault();
    this.pressing = true; // the focus ring is for the keyboard
    this.surface.focus({ preventScroll: true });
    this.pressing = false;
    this.surface.setPointerCapture(event.pointerId);
    const [x, y] = this.placeOf(event);
    const [px, py] = this.ringPlace();
    const onRing = Math.hypot(x - px, y - py) <= 16;
    const mark = onRing ? undefined : this.markAt(x, y);
    this.drag = { dx: onRing ? px - x : 0, dy: onRing ? py - y : 0, mark };
    if (mark) this.movePoint(mark.x, mark.y);
    else if (!onRing) this.movePoint(...this.fractions(x, y));
  }

  pointerMoves(event) {
    if (!this.plot) return;
    const [x, y] = this.placeOf(event);
    const { drag } = this;
    if (!drag) { this.showReadout(x, y); return; }
    if (drag.mark && Math.hypot(this.toX(drag.mark.x) - x, this.toY(drag.mark.y) - y) <= MARK_REACH) return;
    drag.mark = undefined;
    this.movePoint(...this.fractions(x + drag.dx, y + drag.dy));
    this.showReadout(...this.ringPlace(), true);
  }

  release() {
    if (!this.drag) return;
    const { mark } = this.drag;
    this.drag = null;
    if (mark) this.model.send({ kind: "mark", key: mark.key });
    this.adoptPoint();
    this.settle();
  }

  key(event) {
    const directions = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1] };
    const way = directions[event.key];
    if (!way || event.ctrlKey || event.metaKey || event.altKey) return;
    event.preventDefault();
    event.stopPropagation(); // a notebook moves its selection with the same keys
    const step = event.shiftKey ? 1 / 20 : 1 / 100;
    this.showFocus();
    this.movePoint(this.point[0] + step * way[0], this.point[1] + step * way[1]);
    this.showReadout(...this.ringPlace(), true);
  }

  showFocus() {
    this.surface.style.outline = `3px solid ${this.theme.ink}`;
    this.surface.style.outlineOffset = "2px";
  }

  // -------------------------------------------------------------- readout

  cellAt(fx, fy) {
    const [ny, nx] = this.picture.shape;
    const index = (f, n) => Math.max(0, Math.min(n - 1, this.picture.ends_included ? Math.round(f * (n - 1)) : Math.floor(f * n)));
    return index(fy, ny) * nx + index(fx, nx);
  }

  readingAt(fx, fy) {
    const { picture, picture: { colour, data } } = this;
    const reading = (axis, f) => `${axis.label} ${withUnit(valueAt(axis, f), axis.unit)}`;
    const place = [reading(picture.x, fx), reading(picture.y, fy)];
    if ([fx, fy].some((f) => f < 0 || f > 1)) return ["outside the map", ...place];
    const cell = this.cellAt(fx, fy);
    const value = data.values[cell];
    const named = Number.isNaN(value) ? "no number" : colour.categories[value];
    const lines = [named ?? withUnit(value, colour.unit), ...place];
    if (data.holds?.[cell]) lines.push("meets every requirement");
    const bits = data.cautioned?.[cell] ?? 0;
    if (bits) {
      const texts = picture.caution_texts.filter((_, bit) => bits >> bit & 1);
      lines.push(...(texts.length ? texts : [""]).map((text) => (text ? `caution: ${text}` : "caution")));
    }
    return lines;
  }

  showReadout(x, y, ofPoint = false) {
    const { readout, plot, size, width, height } = this;
    const lines = this.readingAt(...(ofPoint ? this.point : this.fractions(x, y)));
    const mark = this.markAt(x, y);
    if (mark) lines.unshift(mark.tooltip || mark.text);
    readout.replaceChildren();
    lines.forEach((text, number) => {
      make("div", `font-size:${size}px;font-weight:${number === 0 ? 600 : 400};white-space:normal;max-width:20em`, readout).textContent = text;
    });
    const [w, h] = [readout.offsetWidth, readout.offsetHeight];
    const gap = ofPoint ? 22 : 16;
    const left = x + gap + w < width ? x + gap : Math.max(2, x - gap - w);
    const top = y - gap - h > 2 ? y - gap - h : Math.min(height - h - 2, y + gap);
    readout.style.transform = `translate(${Math.round(left)}px, ${Math.round(top)}px)`;
    readout.style.visibility = "visible";
  }

  hideReadout() { if (!this.drag) this.readout.style.visibility = "hidden"; }

  listMarks() {
    const texts = this.picture.marks.map((mark) => (mark.tooltip ? `${mark.text}: ${mark.tooltip}` : mark.text));
    const key = texts.join("\n");
    if (key === this.listed) return;
    this.listed = key;
    this.list.replaceChildren();
    for (const text of texts) make("li", "", this.list).textContent = text;
  }
}

function render({ model, el }) {
  const view = new MapView(model, el);
  return () => view.destroy();
}

export default { render };
