// What lies under the pointer, and what is said about it.

// samples of the cable in cells of the screen, each with the row it stands for
function buildGrid() {
  if (grid) return grid;
  const wide = Math.ceil(box.width / CELL_PX), tall = Math.ceil(box.height / CELL_PX), xs = [], ys = [], rows = [];
  const add = (x, y, row) => {
    if (x >= 0 && y >= 0 && x < box.width && y < box.height) { xs.push(x); ys.push(y); rows.push(row); }
  };
  add(screenX(D.soma), screenY(D.soma), D.soma);
  for (const i of flat.order) {
    const p = parent[i], dx = screenX(i) - screenX(p), dy = screenY(i) - screenY(p);
    const count = Math.min(300, Math.max(1, Math.ceil(Math.hypot(dx, dy) / 6)));
    for (let k = 1; k <= count; k++) {
      const part = k / count;
      add(screenX(p) + part * dx, screenY(p) + part * dy, part > 0.5 ? i : p);
    }
  }
  const cell = rows.map((_, k) => Math.floor(ys[k] / CELL_PX) * wide + Math.floor(xs[k] / CELL_PX));
  const start = new Int32Array(wide * tall + 1), order = new Int32Array(rows.length);
  for (const c of cell) start[c + 1]++;
  for (let c = 0; c < wide * tall; c++) start[c + 1] += start[c];
  const next = start.slice();
  cell.forEach((c, k) => { order[next[c]++] = k; });
  const visit = (b, see) => {
    const c0 = Math.max(0, Math.floor(b.l / CELL_PX)), c1 = Math.min(wide - 1, Math.floor(b.r / CELL_PX));
    const r0 = Math.max(0, Math.floor(b.t / CELL_PX)), r1 = Math.min(tall - 1, Math.floor(b.b / CELL_PX));
    for (let r = r0; r <= r1; r++) {
      for (let c = c0; c <= c1; c++) for (let k = start[r * wide + c]; k < start[r * wide + c + 1]; k++) see(order[k]);
    }
  };
  grid = {
    within(b) {
      let count = 0;
      visit(b, (k) => { if (xs[k] > b.l && xs[k] < b.r && ys[k] > b.t && ys[k] < b.b) count++; });
      return count;
    },
    nearest(x, y) {
      let best = REACH_PX ** 2, found = -1;
      visit({ l: x - REACH_PX, r: x + REACH_PX, t: y - REACH_PX, b: y + REACH_PX }, (k) => {
        const away = (xs[k] - x) ** 2 + (ys[k] - y) ** 2;
        if (away < best) { best = away; found = rows[k]; }
      });
      return found;
    },
  };
  return grid;
}

function nearestSite(x, y) {
  let best = Infinity, found = -1;
  D.sites.forEach((site, k) => {
    const away = Math.hypot(screenX(site.row) - x, screenY(site.row) - y);
    if (away < best) { best = away; found = k; }
  });
  return found;
}

function summary(row) {
  const mean = column.get("mean_mV")[row], sd = column.get("sd_mV")[row], place = siteName(row);
  const lines = [`${place ? `${place}, ` : ""}${kindWords(kindName(row))}, SWC id ${ids[row]}, path ${written(path[row], 4)} µm`];
  lines.push(`${written(mean, 4)} ± ${written(sd, 4)} mV`);
  const { label, unit, key } = state.quantity;
  if (key !== "mean_mV" && key !== "sd_mV") lines.push(`${label}: ${written(state.quantity.values()[row], 4)}${unit ? ` ${unit}` : ""}`);
  return lines;
}

function showHint(row, x, y) {
  hint.hidden = row < 0;
  if (row < 0) return;
  hint.textContent = summary(row).join("\n");
  const wide = hint.offsetWidth, tall = hint.offsetHeight;
  const left = Math.min(Math.max(4, x + 16), box.width - wide - 4), top = y + 18 + tall > box.height ? y - tall - 14 : y + 18;
  hint.style.transform = `translate(${Math.max(4, left)}px, ${Math.max(4, top)}px)`;
}
