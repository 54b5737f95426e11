// A small plot of curves. plot.py says what comes; one message a drawing, one canvas.
const FONT = '14px "Noto Sans", "Liberation Sans", Arial, "DejaVu Sans", sans-serif';
const COLOURS = { ink: "#14222b", quiet: "#7b8287", sea: "#1f6b7c", amber: "#a65d00", red: "#c0272d" };

function read(view) {
  const { buffer, byteOffset, byteLength } = view;
  const size = new DataView(buffer, byteOffset, 4).getUint32(0, true);
  const header = JSON.parse(new TextDecoder().decode(new Uint8Array(buffer, byteOffset + 4, size)));
  const [, offset, count] = header.arrays.points;
  const start = 4 + size + offset;
  if (start + 4 * count > byteLength) throw new RangeError("the drawing is shorter than it says");
  // A copy: a view into a larger message need not be aligned.
  const bytes = buffer.slice(byteOffset + start, byteOffset + start + 4 * count);
  return { header, points: new Float32Array(bytes) };
}

// Pixel places of a frame: margins, and scales of both axes. Points count from the lower end of x.
function placed(header, width, height) {
  const left = header.y_ticks.length ? 34 : 6;
  const bottom = header.ticks.length ? (header.label ? 40 : 22) : 4;
  let box = { left, top: 8, right: width - 12, bottom: height - bottom };
  const [x0, x1] = header.x;
  const [y0, y1] = header.y;
  if (header.square) {
    const scale = Math.min((box.right - box.left) / (x1 - x0), (box.bottom - box.top) / (y1 - y0));
    const middle = (box.left + box.right) / 2;
    const half = ((x1 - x0) * scale) / 2;
    box = { left: middle - half, right: middle + half, top: box.bottom - (y1 - y0) * scale, bottom: box.bottom };
  }
  return {
    box,
    x: (value) => box.left + ((value - x0) / (x1 - x0)) * (box.right - box.left),
    along: (distance) => box.left + (distance / (x1 - x0)) * (box.right - box.left),
    y: (value) => box.bottom - ((value - y0) / (y1 - y0)) * (box.bottom - box.top),
  };
}

function draw(canvas, packed, theme) {
  const ratio = window.devicePixelRatio || 1;
  const { clientWidth: width, clientHeight: height } = canvas;
  if (!width || !height || !packed.byteLength) return;
  if (canvas.width !== Math.round(width * ratio) || canvas.height !== Math.round(height * ratio)) {
    canvas.width = Math.round(width * ratio);
    canvas.height = Math.round(height * ratio);
  }
  const pen = canvas.getContext("2d");
  pen.setTransform(ratio, 0, 0, ratio, 0, 0);
  pen.clearRect(0, 0, width, height);
  const { header, points } = read(packed);
  const place = placed(header, width, height);
  let first = 0;
  pen.save();
  pen.beginPath();
  pen.rect(place.box.left - 2, place.box.top - 4, place.box.right - place.box.left + 4, place.box.bottom - place.box.top + 5);
  pen.clip();
  for (const curve of header.curves) {
    stroke(pen, curve, points.subarray(2 * first, 2 * (first + curve.count)), place, theme);
    first += curve.count;
  }
  pen.restore();
  axes(pen, header, place, theme);
}

function stroke(pen, curve, points, place, theme) {
  if (points.length < 4) return;
  const colour = theme(curve.colour);
  pen.beginPath();
  for (let i = 0; i < points.length; i += 2) pen.lineTo(place.along(points[i]), place.y(points[i + 1]));
  if (curve.fill) {
    pen.save();
    const line = new Path2D();
    for (let i = 0; i < points.length; i += 2) line.lineTo(place.along(points[i]), place.y(points[i + 1]));
    if (curve.fill === "base") {
      line.lineTo(place.along(points[points.length - 2]), place.box.bottom);
      line.lineTo(place.along(points[0]), place.box.bottom);
    }
    line.closePath();
    pen.globalAlpha = curve.opacity;
    pen.fillStyle = colour;
    pen.fill(line);
    pen.restore();
  }
  if (!curve.width) return;
  pen.setLineDash(curve.dashed ? [7, 5] : []);
  pen.lineJoin = "round";
  pen.lineWidth = curve.width;
  pen.strokeStyle = colour;
  pen.stroke();
}

function axes(pen, header, place, theme) {
  const { box } = place;
  pen.setLineDash([]);
  pen.lineWidth = 1;
  pen.strokeStyle = pen.fillStyle = theme("ink");
  pen.font = FONT;
  if (header.ticks.length) {
    pen.beginPath();
    pen.moveTo(box.left, box.bottom + 0.5);
    pen.lineTo(box.right, box.bottom + 0.5);
    pen.textAlign = "center";
    pen.textBaseline = "top";
    for (const [at, text] of header.ticks) {
      pen.moveTo(place.x(at), box.bottom);
      pen.lineTo(place.x(at), box.bottom + 5);
      const half = pen.measureText(text).width / 2;
      pen.fillText(text, Math.max(half, place.x(at)), box.bottom + 7);
    }
    pen.stroke();
    pen.fillText(header.label, (box.left + box.right) / 2, box.bottom + 23);
  }
  if (header.y_ticks.length) {
    pen.beginPath();
    pen.moveTo(box.left - 0.5, box.top);
    pen.lineTo(box.left - 0.5, box.bottom);
    pen.textAlign = "right";
    pen.textBaseline = "middle";
    for (const [at, text] of header.y_ticks) {
      pen.moveTo(box.left - 5, place.y(at));
      pen.lineTo(box.left, place.y(at));
      pen.fillText(text, box.left - 8, place.y(at));
    }
    pen.stroke();
  }
}

function render({ model, el }) {
  const canvas = document.createElement("canvas");
  canvas.setAttribute("role", "img");
  canvas.style.cssText = "display:block;position:absolute;inset:0;width:100%;height:100%";
  el.style.position = "relative";
  el.append(canvas);
  let frames = 0;
  const theme = (name) => getComputedStyle(el).getPropertyValue(`--explorer-${name}`).trim() || COLOURS[name];
  const redraw = () => {
    draw(canvas, model.get("packed"), theme);
    canvas.dataset.frame = frames += 1;
  };
  const name = () => canvas.setAttribute("aria-label", model.get("description"));
  const sizes = new ResizeObserver(redraw);
  sizes.observe(el);
  window.addEventListener("explorer-look", redraw);
  model.on("change:packed", redraw);
  model.on("change:description", name);
  name();
  return () => {
    sizes.disconnect();
    window.removeEventListener("explorer-look", redraw);
    model.off("change:packed", redraw);
    model.off("change:description", name);
  };
}

export default { render };
