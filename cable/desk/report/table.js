// The table: named sites or all points, sorted and filtered, and downloaded as CSV with every column.

const PAGE_ROWS = 50;
const list = { rows: [], from: 0, sort: null, down: false };
const FIELDS = [
  { key: "site", label: "site", text: siteName },
  { key: "swc_id", label: "SWC id", values: () => ids, digits: 0 },
  { key: "kind", label: "kind", text: kindName },
  { key: "path_um", label: "path", unit: "µm", values: () => path },
  ...QUANTITIES.map((one) => ({ ...one, label: one.part || one.label, unit: one.part ? "% of var." : one.unit })),
];

function choose() {
  const named = byId("which").value === "sites", kind = byId("kind").value, wanted = byId("find").value.trim().toLowerCase();
  const rows = [];
  for (let row = 0; row < D.rows; row++) {
    if (named && !siteOfRow.has(row)) continue;
    if (kind && kindName(row) !== kind) continue;
    if (wanted && !siteName(row).toLowerCase().includes(wanted) && !String(ids[row]).startsWith(wanted)) continue;
    rows.push(row);
  }
  if (named) rows.sort((a, b) => D.sites.indexOf(siteOfRow.get(a)) - D.sites.indexOf(siteOfRow.get(b)));
  if (list.sort) rows.sort(inOrder(list.sort, list.down));
  list.rows = rows;
  list.from = 0;
  drawTable();
}

// undefined values and empty names stand last, whichever way is sorted
function inOrder(field, down) {
  const sign = down ? -1 : 1;
  if (field.text) {
    return (a, b) => {
      const x = field.text(a), y = field.text(b);
      if (!x || !y) return (x ? 0 : 1) - (y ? 0 : 1);
      return sign * x.localeCompare(y, "en");
    };
  }
  const values = field.values();
  return (a, b) => {
    const lacking = Number(Number.isNaN(values[a])) - Number(Number.isNaN(values[b]));
    return lacking || (Number.isNaN(values[a]) ? 0 : sign * (values[a] - values[b]));
  };
}

function sortBy(field) {
  list.down = list.sort === field ? !list.down : false;
  list.sort = field;
  choose();
  byId(`sort-${FIELDS.indexOf(field)}`).focus();
}

function drawHead() {
  const row = element("tr");
  FIELDS.forEach((field, k) => {
    const cell = element("th", undefined, { scope: "col" }), button = withBreaks(element("button", undefined, { type: "button", id: `sort-${k}` }), field.label);
    const arrow = list.sort === field ? (list.down ? " ↓" : " ↑") : "";
    button.append(arrow);
    if (field.unit) button.append(element("span", field.unit, { class: "unit" }));
    if (list.sort === field) cell.setAttribute("aria-sort", list.down ? "descending" : "ascending");
    button.addEventListener("click", () => sortBy(field));
    cell.append(button);
    row.append(cell);
  });
  byId("grid").tHead.replaceChildren(row);
}

function drawTable() {
  drawHead();
  const rows = list.rows.slice(list.from, list.from + PAGE_ROWS);
  byId("grid").tBodies[0].replaceChildren(...rows.map(tableRow));
  const total = list.rows.length, last = list.from + rows.length;
  byId("shown").textContent = total ? `rows ${list.from + 1} to ${last} of ${total.toLocaleString("en")}` : "no row passes; widen the filters";
  byId("back").disabled = list.from === 0;
  byId("on").disabled = last >= total;
}

function tableRow(row) {
  const line = element("tr", undefined, row === state.first ? { "aria-current": "true" } : {});
  FIELDS.forEach((field, k) => {
    if (k === 0) {
      const cell = element("th", undefined, { scope: "row" }), name = siteName(row);
      const button = element("button", name || "show", { type: "button", "aria-label": `Show ${nameOf(row)} as the first place` });
      button.addEventListener("click", () => pickFirst(row));
      cell.append(button);
      line.append(cell);
      return;
    }
    const text = field.text ? field.text(row) : field.digits === 0 ? String(field.values()[row]) : written(field.values()[row]);
    line.append(element("td", text));
  });
  return line;
}

const FORMULA = /^[=+\-@\t\r]/;

function csvText() {
  const cell = (value) => {
    const safe = FORMULA.test(value) ? `'${value}` : value;
    return /[",\r\n]/.test(safe) ? `"${safe.replaceAll('"', '""')}"` : safe;
  };
  const number = (packed, value) => (Number.isFinite(value) ? String(packed === "f4" ? Number(value.toPrecision(7)) : value) : "");
  const kinds = new Map(D.columns.map((one) => [one.key, one.type]));
  const lines = [D.order.map(cell).join(",")];
  for (const row of list.rows) {
    lines.push(D.order.map((key) => {
      if (key === "site") return cell(siteName(row));
      if (key === "kind") return cell(kindName(row));
      return number(kinds.get(key), column.get(key)[row]);
    }).join(","));
  }
  return `${lines.join("\r\n")}\r\n`;
}

function download() {
  const address = URL.createObjectURL(new Blob([csvText()], { type: "text/csv;charset=utf-8" }));
  const link = element("a", "", { href: address, download: byId("which").value === "sites" ? "sites.csv" : "points.csv" });
  link.click();
  setTimeout(() => URL.revokeObjectURL(address), 1000);
}
