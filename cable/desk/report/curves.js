// The curves: the way from the soma to a place, spectra, correlation against lag, coherence.

const SVG = "http://www.w3.org/2000/svg";
const PLOT = { left: 58, right: 14, top: 8, bottom: 40, height: 236, paper: 400 };

function svg(name, attributes, text) {
  const made = document.createElementNS(SVG, name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  if (text !== undefined) made.textContent = text;
  return made;
}

function way(row) {
  const upwards = (from) => {
    const rows = [];
    for (let at = from; at >= 0; at = parent[at]) rows.push(at);
    return rows;
  };
  const mine = upwards(row).reverse(), soma = upwards(D.soma).reverse();
  let shared = 0;
  while (shared < mine.length && shared < soma.length && mine[shared] === soma[shared]) shared++;
  const rows = [...soma.slice(shared - 1).reverse(), ...mine.slice(shared)], distance = [0];
  for (let k = 1; k < rows.length; k++) distance.push(distance[k - 1] + Math.abs(path[rows[k]] - path[rows[k - 1]]));
  return { rows, distance };
}

// a spectrum by frequency: of a site fine and by input, of a point in all
function spectrumOf(row) {
  const parts = siteName(row) ? new Map(Object.entries(D.spectrum.parts)).get(siteName(row)) : undefined;
  if (!parts) return { x: D.spectrum.frequency_Hz, y: densityOf(row), parts: [] };
  const x = D.spectrum.site_frequency_Hz;
  return { x, y: x.map((_, k) => parts.reduce((sum, part) => sum + part[k], 0)), parts };
}

function densityOf(row) {
  const { top, per_decade: steps, nothing } = D.spectrum.density, count = D.spectrum.frequency_Hz.length;
  return Array.from(density().subarray(row * count, (row + 1) * count), (v) => (v === nothing ? NaN : 10 ** (top + v / steps)));
}

function extent(lists, log, wished) {
  let low = Infinity, high = -Infinity;
  for (const list of lists) {
    for (const v of list) if (Number.isFinite(v) && (!log || v > 0)) { low = Math.min(low, v); high = Math.max(high, v); }
  }
  if (low > high) return log ? [0.1, 1] : [0, 1];
  if (wished) return wished;
  if (log) return [Math.max(low, high * 1e-8), high * 2.5];
  const slack = (high - low || Math.abs(high) || 1) * 0.06;
  return [low - slack, high + slack];
}

// a figure of lines: { title, x: { label, log }, y: { label, log, range }, lines: [{ name, style, x, y, band }] }
function chart(id, what) {
  const figure = byId(id), caption = element("figcaption", what.title);
  if (!what.lines.length) {
    caption.append(element("span", what.none, { class: "key" }));
    figure.replaceChildren(caption);
    return;
  }
  const named = what.lines.filter((line) => line.style !== "part"), parts = what.lines.filter((line) => line.style === "part");
  const key = named.map((line) => `${line.style === "first" ? "solid" : "broken"}: ${line.name}`);
  if (parts.length) key.push("thin: its inputs");
  if (what.more) key.push(what.more);
  caption.append(element("span", key.join("; "), { class: "key" }));
  const wide = isPaper() ? PLOT.paper : Math.max(300, figure.clientWidth || 520), { left, right, top, bottom, height } = PLOT;
  const [x0, x1] = extent(what.lines.map((line) => line.x), what.x.log, what.x.range);
  const [y0, y1] = extent(what.lines.flatMap((line) => (line.band ? [line.y, ...line.band] : line.style === "part" && what.y.log ? [] : [line.y])), what.y.log, what.y.range);
  const scaled = (v, low, high, log) => (log ? Math.log(v / low) / Math.log(high / low) : (v - low) / (high - low));
  const px = (v) => left + (wide - left - right) * scaled(v, x0, x1, what.x.log);
  const py = (v) => height - bottom - (height - top - bottom) * scaled(v, y0, y1, what.y.log);
  const drawing = svg("svg", { viewBox: `0 0 ${wide} ${height}`, role: "img", "aria-label": what.spoken });
  const across = ticksFor(x0, x1, what.x.log, 6), upwards = ticksFor(y0, y1, what.y.log, 5);
  for (const v of upwards) {
    drawing.append(svg("line", { class: "guide", x1: left, x2: wide - right, y1: py(v), y2: py(v) }));
    drawing.append(svg("text", { x: left - 7, y: py(v) + 4, "text-anchor": "end" }, tickText(v, what.y.log, upwards)));
  }
  for (const v of across) {
    drawing.append(svg("line", { class: "axis", x1: px(v), x2: px(v), y1: height - bottom, y2: height - bottom + 4 }));
    drawing.append(svg("text", { x: px(v), y: height - bottom + 17, "text-anchor": "middle" }, tickText(v, what.x.log, across)));
  }
  drawing.append(svg("line", { class: "axis", x1: left, x2: wide - right, y1: height - bottom, y2: height - bottom }));
  drawing.append(svg("text", { x: (left + wide - right) / 2, y: height - 6, "text-anchor": "middle" }, what.x.label));
  drawing.append(svg("text", { transform: `translate(13 ${(top + height - bottom) / 2}) rotate(-90)`, "text-anchor": "middle" }, what.y.label));
  const clip = `${id}-clip`, inside = svg("g", { "clip-path": `url(#${clip})` });
  const hole = svg("clipPath", { id: clip });
  hole.append(svg("rect", { x: left, y: top - 4, width: wide - left - right, height: height - top - bottom + 6 }));
  drawing.append(hole, inside);
  const track = (xs, ys) => {
    let text = "", down = false;
    ys.forEach((y, k) => {
      const seen = Number.isFinite(y) && (!what.y.log || y > 0) && (!what.x.log || xs[k] > 0);
      if (seen) text += `${down ? "L" : "M"}${px(xs[k]).toFixed(1)} ${Math.min(Math.max(py(y), -1e4), 1e4).toFixed(1)}`;
      down = seen;
    });
    return text;
  };
  for (const line of what.lines) {
    if (line.band && line.band[0].every(Number.isFinite)) {
      const [lower, upper] = line.band, back = track([...line.x].reverse(), [...lower].reverse()).replace("M", "L");
      inside.append(svg("path", { class: line.style === "first" ? "band" : "band other", d: `${track(line.x, upper)}${back}Z` }));
    }
  }
  for (const line of [...parts, ...named]) inside.append(svg("path", { class: line.style, d: track(line.x, line.y) }));
  // thin lines carry their names at the left, beside one another where lines come close
  const taken = [];
  for (const line of parts) {
    const k = line.y.findIndex((v) => v > 0);
    if (k < 0 || line.y[k] < y0) continue;
    const text = line.name.length > 34 ? `${line.name.slice(0, 33)}…` : line.name, y = py(line.y[k]) - 5;
    const x = Math.max(left + 5, ...taken.filter((one) => Math.abs(one.y - y) < 13).map((one) => one.end));
    taken.push({ y, end: x + 6.6 * text.length + 14 });
    if (x + 6.6 * text.length < wide - right) drawing.append(svg("text", { x, y, class: "name" }, text));
  }
  figure.replaceChildren(caption, drawing);
}

function drawCurves() {
  const first = state.first, second = state.second >= 0 ? D.sites[state.second] : null;
  const places = [[first, "first"]];
  if (second && second.row !== first) places.push([second.row, "second"]);
  profileChart(places);
  spectrumChart(places);
  pairCharts(first, second);
}

function profileChart(places) {
  const mean = column.get("mean_mV"), sd = column.get("sd_mV"), lines = [];
  for (const [row, style] of places) {
    const { rows, distance } = way(row), m = rows.map((r) => mean[r]), s = rows.map((r) => sd[r]);
    if (rows.length > 1) lines.push({ name: `to ${nameOf(row)}`, style, x: distance, y: m, band: [m.map((v, k) => v - s[k]), m.map((v, k) => v + s[k])] });
  }
  const ends = lines.map((line) => `${line.name}: ${written(line.y[0], 4)} mV at the soma, ${written(line.y.at(-1), 4)} mV at ${written(line.x.at(-1), 4)} µm`);
  const shown = { title: "Mean ± SD on the way from the soma", x: { label: "distance from the soma (µm)" }, y: { label: "voltage (mV)" }, lines };
  if (lines.length) shown.x.range = [0, Math.max(...lines.map((line) => line.x.at(-1)))];
  chart("profile", { ...shown, none: "The first place is the soma; pick another place to see the way to it.", spoken: `Mean voltage on the way from the soma. ${ends.join("; ")}.` });
}

function spectrumChart(places) {
  const frequency = D.spectrum.frequency_Hz, lines = [], told = [], first = spectrumOf(places[0][0]);
  for (const [row, style] of places) {
    const { x, y } = spectrumOf(row);
    if (!y.some((v) => v > 0)) continue;
    lines.push({ name: nameOf(row), style, x, y });
    told.push(`${nameOf(row)}: ${written(y[0], 3)} mV² per Hz at ${tickText(frequency[0])} Hz, ${written(y.at(-1), 3)} at ${tickText(frequency.at(-1))} Hz`);
  }
  if (lines.length && D.parts.length > 1) {
    first.parts.forEach((y, k) => lines.push({ name: D.parts[k], style: "part", x: first.x, y }));
  }
  chart("spectrum", {
    title: "Power spectral density, one-sided", x: { label: "frequency (Hz)", log: true, range: [frequency[0], frequency.at(-1)] }, y: { label: "mV²/Hz", log: true },
    lines, none: "Nothing fluctuates here.", spoken: `Spectra. ${told.join("; ")}.`,
  });
}

function pairCharts(first, second) {
  const lag = { title: "Correlation against lag" }, coherence = { title: "Coherence" };
  const a = curveSites.indexOf(siteName(first)), b = second ? curveSites.indexOf(second.name) : a;
  if (siteName(first) === "" || a < 0 || b < 0) {
    const none = siteName(first) === "" ? "Curves against lag are kept for named sites; choose one as the first place." : "The file holds no such curves for these two.";
    chart("lags", { ...lag, lines: [], none });
    chart("coherence", { ...coherence, lines: [], none });
    return;
  }
  const count = D.curves.lag_ms.length, size = curveSites.length;
  const of = (i, j) => Array.from(lagCorrelation().subarray((i * size + j) * count, (i * size + j + 1) * count));
  const forward = of(a, b), backward = of(b, a), times = D.curves.lag_ms;
  const x = [...times.slice(1).reverse().map((t) => -t), ...times], y = [...backward.slice(1).reverse(), ...forward];
  const name = a === b ? `${curveSites[a]} with itself` : `${curveSites[a]} and ${curveSites[b]}`, low = Math.min(0, ...y), high = Math.max(1, ...y);
  const lines = [{ name, style: "first", x, y }];
  const zero = forward[0];
  chart("lags", {
    ...lag, lines, more: a === b ? "" : `to the right, ${curveSites[b]} is later`, x: { label: "lag (ms)", range: [x[0], x.at(-1)] },
    y: { label: "correlation", range: [low - 0.03 * (high - low), high + 0.03 * (high - low)] }, spoken: `Correlation of ${name} against lag; ${written(zero, 4)} at lag 0.`,
  });
  if (a === b) {
    chart("coherence", { ...coherence, lines: [], none: "Choose a second site to see what the two share by frequency." });
    return;
  }
  const frequency = D.spectrum.site_frequency_Hz, f = frequency.length;
  const shared = Array.from(coherences().subarray((a * size + b) * f, (a * size + b + 1) * f));
  chart("coherence", {
    ...coherence, lines: [{ name, style: "first", x: frequency, y: shared }], x: { label: "frequency (Hz)", log: true, range: [frequency[0], frequency.at(-1)] },
    y: { label: "coherence", range: [0, 1.02] }, spoken: `Coherence of ${name}: ${written(shared[0], 3)} at ${tickText(frequency[0])} Hz, ${written(shared.at(-1), 3)} at ${tickText(frequency.at(-1))} Hz.`,
  });
}
