// What stands in the page as text, back as columns of numbers; how numbers are written; what may be shown.

const D = JSON.parse(document.getElementById("data").textContent);
const KINDS_OF_ARRAY = { f4: Float32Array, f8: Float64Array, i4: Int32Array, i2: Int16Array };

function unpack(packed) {
  const text = atob(packed.bytes);
  const bytes = new Uint8Array(text.length);
  for (let i = 0; i < text.length; i++) bytes[i] = text.charCodeAt(i);
  return new KINDS_OF_ARRAY[packed.type](bytes.buffer);
}

const once = (make) => {
  let made;
  return () => (made === undefined ? (made = make()) : made);
};

const column = new Map(D.columns.map((one) => [one.key, unpack(one)]));
const parent = unpack(D.parent);
const kindIndex = unpack(D.kind);
const near = unpack(D.near), far = unpack(D.far);
const radiusNear = unpack(D.radius_near_um), radiusFar = unpack(D.radius_far_um);
const siteOfRow = new Map(D.sites.map((site) => [site.row, site]));
const ids = column.get("swc_id"), path = column.get("path_um");
const density = once(() => unpack(D.spectrum.density));
const curveSites = D.curves ? D.curves.sites : [];
const lagCorrelation = once(() => unpack(D.curves.correlation));
const coherences = once(() => unpack(D.curves.coherence));

const siteName = (row) => (siteOfRow.has(row) ? siteOfRow.get(row).name : "");
const kindName = (row) => D.kinds[kindIndex[row]];
const kindWords = (word) => (/^\d/.test(word) ? `kind ${word}` : word);
const nameOf = (row) => siteName(row) || `SWC id ${ids[row]}`;

const share = (part) => {
  const some = column.get(`variance_${part}_mV2`), all = column.get("variance_mV2");
  return Float64Array.from(some, (value, row) => (all[row] > 0 ? (100 * value) / all[row] : NaN));
};

// every quantity that is read or drawn: its heading, its unit, its values
const QUANTITIES = [
  { key: "mean_mV", label: "mean", unit: "mV" },
  { key: "sd_mV", label: "SD", unit: "mV" },
  { key: "correlation_time_ms", label: "correlation time", unit: "ms" },
  { key: "input_resistance_MOhm", label: "input resistance", unit: "MΩ" },
  { key: "upcrossing_Hz", label: `upcrossings of ${String(D.threshold_mV).replace("-", "−")} mV`, unit: "Hz", log: true },
].filter((one) => column.has(one.key));
for (const one of QUANTITIES) one.values = () => column.get(one.key);
for (const part of D.parts) {
  QUANTITIES.push({ key: `share ${part}`, label: `share of ${part}`, unit: "% of the variance", part, values: once(() => share(part)) });
}
const withPartner = (site) => [
  { key: "correlation", label: `correlation with ${site}`, unit: "", partner: site, values: () => column.get(`correlation_with_${site}`) },
  { key: "lag", label: `lag behind ${site}`, unit: "ms", partner: site, values: () => column.get(`lag_behind_${site}_ms`) },
];

const RAISED = { "-": "⁻", 0: "⁰", 1: "¹", 2: "²", 3: "³", 4: "⁴", 5: "⁵", 6: "⁶", 7: "⁷", 8: "⁸", 9: "⁹" };

function written(value, digits = 5) {
  if (!Number.isFinite(value)) return "undefined";
  if (value === 0) return "0";
  const size = Math.abs(value);
  let text;
  if (size < 1e-3 || size >= 1e6) {
    const [head, power] = value.toExponential(digits - 1).split("e");
    text = `${head} × 10${[...String(Number(power))].map((c) => RAISED[c]).join("")}`;
  } else {
    const whole = Math.floor(Math.log10(size)) + 1;
    text = whole >= digits ? value.toFixed(0) : value.toPrecision(digits);
  }
  return text.replace("-", "−");
}

function ticksFor(low, high, log, most = 6) {
  if (log) {
    const first = Math.ceil(Math.log10(low) - 1e-9), last = Math.floor(Math.log10(high) + 1e-9);
    const step = Math.max(1, Math.ceil((last - first) / most));
    const found = [];
    for (let power = first; power <= last; power += step) found.push(10 ** power);
    return found;
  }
  const rough = (high - low) / most, size = 10 ** Math.floor(Math.log10(rough));
  const step = [1, 2, 5, 10].map((m) => m * size).find((s) => s >= rough * (1 - 1e-9));
  const found = [];
  for (let k = Math.ceil(low / step - 1e-9); k * step <= high + 1e-9 * step; k++) found.push(k * step);
  return found;
}

// numbers at an axis: of a logarithmic one all alike, as powers of ten where it goes far
function tickText(value, log, all = [value]) {
  if (value === 0) return "0";
  const power = Math.round(Math.log10(Math.abs(value)));
  if (log && all.some((one) => one < 0.009 || one > 1100)) return `10${[...String(power)].map((c) => RAISED[c]).join("")}`;
  return String(Number(value.toPrecision(6))).replace("-", "−");
}

function element(name, text, attributes = {}) {
  const made = document.createElement(name);
  if (text !== undefined) made.textContent = text;
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  return made;
}

// a name which may be broken after its underscores
function withBreaks(made, text) {
  text.split(/(?<=_)/).forEach((part, k) => made.append(...(k ? [document.createElement("wbr"), part] : [part])));
  return made;
}

const byId = (id) => document.getElementById(id);
