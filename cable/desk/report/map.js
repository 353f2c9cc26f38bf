// The map: the cell to scale in colour on one canvas, marks and the pointer on another above it.

const state = { first: 0, second: -1, hover: -1, focus: -1, quantity: null, view: D.view };
const base = byId("base"), overlay = byId("overlay"), hint = byId("hint");
const PAD = 30, THINNEST = 1.2, STEP_PX = 7, CELL_PX = 14, REACH_PX = 26, CLICK_PX = 4;
const PAPER = { width: 440, height: 410, ratio: 3 };  // as a page of A4 has it
const printing = matchMedia("print"), wishesDark = matchMedia("(prefers-color-scheme: dark)");
const flat = { x: new Float64Array(D.rows), y: new Float64Array(D.rows), order: null };
const box = { width: 0, height: 0, ratio: 1 };
const eye = { scale: 1, x: 0, y: 0 };  // pixels a µm, and where the origin of the plane lies
let grid = null;

const isPaper = () => printing.matches || Boolean(document.documentElement.dataset.printing);

function isDark() {
  if (isPaper()) return false;
  const chosen = document.documentElement.dataset.theme;
  return chosen ? chosen === "dark" : wishesDark.matches;
}

const shades = new Map();  // emptied when the page changes its colours

function shade(name) {
  if (!shades.has(name)) shades.set(name, getComputedStyle(document.documentElement).getPropertyValue(name).trim());
  return shades.get(name);
}

function project() {
  const [right, up, toward] = D.views.find((view) => view.name === state.view).axes;
  const x = column.get("x_um"), y = column.get("y_um"), z = column.get("z_um");
  const depth = new Float64Array(D.points);
  for (let i = 0; i < D.rows; i++) {
    flat.x[i] = right[0] * x[i] + right[1] * y[i] + right[2] * z[i];
    flat.y[i] = -(up[0] * x[i] + up[1] * y[i] + up[2] * z[i]);
    if (i < D.points) depth[i] = toward[0] * x[i] + toward[1] * y[i] + toward[2] * z[i];
  }
  const order = [];
  for (let i = 1; i < D.points; i++) if (far[i] > near[i]) order.push(i);
  flat.order = order.sort((a, b) => depth[a] - depth[b]);
}

function fit() {
  const low = [Infinity, Infinity], high = [-Infinity, -Infinity];
  const include = (x, y, r) => {
    low[0] = Math.min(low[0], x - r); low[1] = Math.min(low[1], y - r);
    high[0] = Math.max(high[0], x + r); high[1] = Math.max(high[1], y + r);
  };
  const radius = column.get("radius_um");
  for (let i = 0; i < D.points; i++) include(flat.x[i], flat.y[i], radius[i]);
  for (const sphere of D.spheres) include(flat.x[sphere.row], flat.y[sphere.row], sphere.radius_um);
  const wide = Math.max(high[0] - low[0], 1e-6), tall = Math.max(high[1] - low[1], 1e-6);
  const top = PAD + 14, foot = PAD + 20;
  eye.scale = Math.min((box.width - 2 * PAD) / wide, (box.height - top - foot) / tall);
  eye.x = box.width / 2 - (eye.scale * (low[0] + high[0])) / 2;
  eye.y = (box.height + top - foot) / 2 - (eye.scale * (low[1] + high[1])) / 2;
  eye.whole = eye.scale;
  grid = null;
}

function zoom(factor, x = box.width / 2, y = box.height / 2) {
  const scale = Math.min(Math.max(eye.scale * factor, eye.whole * 0.5), eye.whole * 60);
  eye.x = x - ((x - eye.x) * scale) / eye.scale;
  eye.y = y - ((y - eye.y) * scale) / eye.scale;
  eye.scale = scale;
  grid = null;
  drawBase();
}

const screenX = (row) => eye.x + eye.scale * flat.x[row];
const screenY = (row) => eye.y + eye.scale * flat.y[row];

function resize() {
  const own = { width: byId("map").clientWidth, height: byId("map").clientHeight, ratio: Math.max(devicePixelRatio || 1, 1.5) };
  const wished = isPaper() ? PAPER : own;
  if (!wished.width || (wished.width === box.width && wished.height === box.height)) return;
  Object.assign(box, wished);
  for (const canvas of [base, overlay]) {
    canvas.width = Math.round(box.width * box.ratio);
    canvas.height = Math.round(box.height * box.ratio);
  }
  fit();
  drawBase();
}

// the scale of colours: values to a share of the bar
function colourScale(quantity) {
  const values = quantity.values();
  let low = Infinity, high = -Infinity;
  for (let i = 0; i < D.points; i++) {
    const value = values[i];
    if (Number.isFinite(value) && (!quantity.log || value > 0)) { low = Math.min(low, value); high = Math.max(high, value); }
  }
  if (low > high) [low, high] = quantity.log ? [0.1, 10] : [0, 1];
  if (quantity.log) low = Math.max(low, high * 1e-12);
  if (high - low <= 1e-6 * Math.abs(high)) [low, high] = quantity.log ? [low / 2, high * 2] : [low - 0.5, high + 0.5];
  const change = quantity.log ? Math.log10 : (v) => v;
  const start = change(low), length = change(high) - change(low);
  return { low, high, log: quantity.log, at: (v) => (change(v) - start) / length };
}

function emptied(canvas) {
  const pen = canvas.getContext("2d");
  pen.setTransform(box.ratio, 0, 0, box.ratio, 0, 0);
  pen.clearRect(0, 0, box.width, box.height);
  return pen;
}

function drawBase() {
  shades.clear();
  const pen = emptied(base);
  const colours = isDark() ? D.colours.dark : D.colours.light, last = colours.length - 1;
  const scale = colourScale(state.quantity), values = state.quantity.values(), blank = shade("--line");
  const colour = (value) => {
    const place = scale.at(value);
    if (Number.isNaN(place)) return blank;
    return colours[Math.round(last * Math.min(Math.max(place, 0), 1))];
  };
  pen.lineCap = "round";
  for (const i of flat.order) {
    const p = parent[i], xp = screenX(p), yp = screenY(p), dx = screenX(i) - xp, dy = screenY(i) - yp;
    if (Math.max(xp, xp + dx) < -40 || Math.min(xp, xp + dx) > box.width + 40) continue;
    if (Math.max(yp, yp + dy) < -40 || Math.min(yp, yp + dy) > box.height + 40) continue;
    const span = far[i] - near[i], pieces = Math.min(400, Math.max(1, Math.ceil((span * Math.hypot(dx, dy)) / STEP_PX)));
    for (let k = 0; k < pieces; k++) {
      const from = near[i] + (span * k) / pieces, to = near[i] + (span * (k + 1)) / pieces, middle = (k + 0.5) / pieces;
      pen.strokeStyle = colour(values[p] + middle * (values[i] - values[p]));
      pen.lineWidth = Math.max(THINNEST, 2 * eye.scale * (radiusNear[i] + middle * (radiusFar[i] - radiusNear[i])));
      pen.beginPath();
      pen.moveTo(xp + from * dx, yp + from * dy);
      pen.lineTo(xp + to * dx, yp + to * dy);
      pen.stroke();
    }
  }
  for (const sphere of D.spheres) {
    pen.beginPath();
    pen.arc(screenX(sphere.row), screenY(sphere.row), Math.max(2, sphere.radius_um * eye.scale), 0, 2 * Math.PI);
    pen.fillStyle = colour(values[sphere.row]);
    pen.fill();
    pen.lineWidth = 0.8;
    pen.strokeStyle = shade("--ink");
    pen.stroke();
  }
  drawScaleBar(pen);
  drawNames(pen);
  drawBar(scale, colours);
  drawOverlay();
}

function drawScaleBar(pen) {
  const longest = 110 / eye.scale, size = 10 ** Math.floor(Math.log10(longest));
  const length = [5, 2, 1].map((m) => m * size).find((l) => l <= longest);
  pen.strokeStyle = pen.fillStyle = shade("--ink");
  pen.lineWidth = 2.5;
  pen.lineCap = "butt";
  pen.beginPath();
  pen.moveTo(14, box.height - 14);
  pen.lineTo(14 + length * eye.scale, box.height - 14);
  pen.stroke();
  pen.font = `12px ${shade("--text")}`;
  pen.textAlign = "left";
  pen.textBaseline = "alphabetic";
  pen.fillText(`${tickText(length)} µm`, 14, box.height - 20);
}

// names stand where they cover no other name and as little of the cell as may be
function drawNames(pen) {
  const marks = D.sites.map((site) => ({ text: site.name, row: site.row, site: true }));
  for (const label of D.kind_labels) marks.push({ text: label.word, row: label.row });
  const cells = buildGrid(), placed = [], ink = shade("--ink"), soft = shade("--soft"), ground = shade("--panel");
  // above a site stands the number of the first or second place
  const badges = D.sites.map((site) => ({ x: screenX(site.row), y: screenY(site.row) }));
  pen.textBaseline = "middle";
  for (const mark of marks) {
    const x = screenX(mark.row), y = screenY(mark.row);
    if (x < 0 || y < 0 || x > box.width || y > box.height) continue;
    const text = mark.text.length > 28 ? `${mark.text.slice(0, 27)}…` : mark.text;
    pen.font = `${mark.site ? "" : "italic "}12px ${shade("--text")}`;
    const wide = pen.measureText(text).width, sphere = D.spheres.find((one) => one.row === mark.row);
    const off = 9 + (sphere ? sphere.radius_um * eye.scale : 0);
    let best = null;
    for (const gap of [off, off + 12, off + 26]) {
      for (let turn = 0; turn < 12; turn++) {
        const a = (turn * Math.PI) / 6, cx = x + gap * Math.cos(a) + (wide / 2) * Math.cos(a), cy = y + (gap + 4) * Math.sin(a);
        const b = { l: cx - wide / 2 - 2, r: cx + wide / 2 + 2, t: cy - 8, b: cy + 8 };
        let cost = gap / 8 + 0.2 * Math.abs(Math.sin(a)) + cells.within(b);
        if (sphere && Math.hypot(Math.max(b.l - x, 0, x - b.r), Math.max(b.t - y, 0, y - b.b)) < sphere.radius_um * eye.scale + 2) cost += 60;
        if (b.l < 2 || b.r > box.width - 2 || b.t < 2 || b.b > box.height - 2) cost += 500;
        if (b.l < 150 && b.b > box.height - 36) cost += 400;
        if (b.r > box.width - 190 && b.t < 44) cost += 400;
        for (const o of badges) if (b.l < o.x + 10 && b.r > o.x - 10 && b.t < o.y + 7 && b.b > o.y - 24) cost += 40;
        for (const o of placed) if (b.l < o.r && b.r > o.l && b.t < o.b && b.b > o.t) cost += 300;
        if (!best || cost < best.cost) best = { ...b, cost, cx, cy };
      }
    }
    if (!mark.site && best.cost > 250) continue;
    placed.push(best);
    pen.textAlign = "center";
    pen.lineWidth = 3.5;
    pen.lineJoin = "round";
    pen.strokeStyle = ground;
    pen.strokeText(text, best.cx, best.cy);
    pen.fillStyle = mark.site ? ink : soft;
    pen.fillText(text, best.cx, best.cy);
    if (mark.site && !sphere) ring(pen, x, y, 4, 1.2, ink, ground);
  }
}

function ring(pen, x, y, radius, width, ink, ground) {
  for (const [style, wide] of [[ground, width + 2], [ink, width]]) {
    pen.beginPath();
    pen.arc(x, y, radius, 0, 2 * Math.PI);
    pen.strokeStyle = style;
    pen.lineWidth = wide;
    pen.stroke();
  }
}

function drawOverlay() {
  // on paper all is one drawing: an empty canvas above would print white
  const pen = isPaper() ? base.getContext("2d") : emptied(overlay), ink = shade("--ink"), ground = shade("--panel");
  pen.font = `600 12px ${shade("--text")}`;
  pen.textAlign = "center";
  pen.textBaseline = "middle";
  const marks = [[state.first, "1"]];
  if (state.second >= 0) marks.push([D.sites[state.second].row, "2"]);
  for (const [row, text] of marks) {
    const x = screenX(row), y = screenY(row) - 15;
    ring(pen, screenX(row), screenY(row), 5.5, 2, ink, ground);
    pen.beginPath();
    pen.arc(x, y, 8, 0, 2 * Math.PI);
    pen.fillStyle = ink;
    pen.fill();
    pen.fillStyle = ground;
    pen.fillText(text, x, y + 0.5);
  }
  const at = state.hover >= 0 ? state.hover : state.focus;
  if (at >= 0) ring(pen, screenX(at), screenY(at), 7, 2, shade("--accent"), ground);
}

function drawBar(scale, colours) {
  const bar = byId("bar"), pen = bar.getContext("2d");
  bar.width = 4 * colours.length;
  bar.height = 4;
  colours.forEach((one, k) => { pen.fillStyle = one; pen.fillRect(4 * k, 0, 5, 4); });  // each a little under the next: no seams
  const { label, unit } = state.quantity;
  byId("bar-label").textContent = unit ? `${label} (${unit})` : label;
  const inner = ticksFor(scale.low, scale.high, scale.log, 4).filter((v) => scale.at(v) > 0.14 && scale.at(v) < 0.86);
  const digits = scale.log ? 3 : Math.max(3, Math.ceil(Math.log10(Math.max(Math.abs(scale.low), Math.abs(scale.high)) / (scale.high - scale.low))) + 2);
  byId("ticks").replaceChildren(...[scale.low, ...inner, scale.high].map((value) => {
    const mark = element("span", inner.includes(value) ? tickText(value, scale.log, inner) : written(value, digits));
    mark.style.left = `${100 * scale.at(value)}%`;
    return mark;
  }));
}
