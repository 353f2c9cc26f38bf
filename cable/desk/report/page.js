// What a person does, and what follows from it.

function options(select, entries, chosen) {
  select.replaceChildren(...entries.map(([value, text]) => element("option", text, { value })));
  select.value = chosen;
}

function partnerQuantities() {
  const site = state.second >= 0 ? D.sites[state.second].name : "";
  return D.partners.includes(site) ? withPartner(site) : [];
}

function fillQuantities() {
  const all = [...QUANTITIES, ...partnerQuantities()];
  const kept = all.find((one) => one.key === state.quantity.key) || all.find((one) => one.key === "sd_mV");
  state.quantity = kept;
  options(byId("quantity"), all.map((one) => [one.key, one.unit ? `${one.label} (${one.unit})` : one.label]), kept.key);
}

function fillPlaces() {
  const named = D.sites.map((site) => [String(site.row), site.name]);
  if (!siteOfRow.has(state.first)) named.push([String(state.first), `SWC id ${ids[state.first]}, ${kindWords(kindName(state.first))}`]);
  options(byId("first"), named, String(state.first));
  options(byId("second"), [["-1", "none"], ...D.sites.map((site, k) => [String(k), site.name])], String(state.second));
}

function drawReading() {
  const rows = [state.first], heads = [nameOf(state.first)];
  if (state.second >= 0) { rows.push(D.sites[state.second].row); heads.push(D.sites[state.second].name); }
  const head = element("tr");
  head.append(element("td"), ...heads.map((text, k) => element("th", `${k + 1}: ${text}`, { scope: "col" })));
  byId("reading").tHead.replaceChildren(head);
  const lines = [
    ["kind", (row) => kindWords(kindName(row))],
    ["SWC id", (row) => String(ids[row])],
    ["from the soma, µm", (row) => written(way(row).distance.at(-1), 4)],
    ...QUANTITIES.map((one) => [one.part ? `${one.part}, %` : `${one.label}, ${one.unit}`, (row) => written(one.values()[row])]),
  ];
  byId("reading").tBodies[0].replaceChildren(...lines.map(([label, value]) => {
    const line = element("tr");
    line.append(withBreaks(element("th", undefined, { scope: "row" }), label), ...rows.map((row) => element("td", value(row))));
    return line;
  }));
  byId("together").textContent = togetherText();
}

function togetherText() {
  if (state.second < 0) return "Choose a second site to see what the two places share.";
  const { name, row } = D.sites[state.second], [correlation, lag] = withPartner(name);
  if (row === state.first) return "Both are the same place.";
  if (!D.partners.includes(name)) return `This file keeps no correlations with ${name}: the cell is large and its sites are many.`;
  const c = correlation.values()[state.first], l = lag.values()[state.first];
  if (!Number.isFinite(c)) return "One of the two does not fluctuate.";
  const order = Math.abs(l) < 5e-4 ? "neither is behind the other" : `${nameOf(state.first)} is ${l > 0 ? "behind" : "ahead of"} ${name} by ${written(Math.abs(l), 3)} ms in slow fluctuations`;
  return `The correlation of ${nameOf(state.first)} and ${name} is ${written(c, 4)}; ${order}.`;
}

function afterPick() {
  state.focus = -1;
  fillPlaces();
  drawReading();
  drawOverlay();
  drawCurves();
  drawTable();
}

function pickFirst(row) {
  state.first = row;
  afterPick();
}

function pickSecond(k) {
  state.second = k;
  const before = state.quantity;
  fillQuantities();
  afterPick();
  if (state.quantity !== before) drawBase();
}

// arrow keys walk along the tree
const children = once(() => {
  const found = Array.from({ length: D.points }, () => []);
  for (let i = 1; i < D.points; i++) found[parent[i]].push(i);
  return found;
});

function walk(key, at) {
  if (key === "Home") return D.soma;
  if (key === "ArrowUp") return parent[at] >= 0 ? parent[at] : at;
  if (key === "ArrowDown") return at < D.points && children()[at].length ? children()[at][0] : at;
  let fork = at;  // the nearest point above at which there is a choice
  while (parent[fork] >= 0 && children()[parent[fork]].length < 2) fork = parent[fork];
  if (parent[fork] < 0 || fork >= D.points) return at;
  const beside = children()[parent[fork]], step = key === "ArrowRight" ? 1 : -1;
  return beside[(beside.indexOf(fork) + step + beside.length) % beside.length];
}

function onKey(event) {
  if (event.ctrlKey || event.metaKey || event.altKey) return;
  const at = state.focus >= 0 ? state.focus : state.first;
  if (["ArrowUp", "ArrowDown", "ArrowLeft", "ArrowRight", "Home"].includes(event.key)) {
    state.focus = walk(event.key, at);
    state.hover = -1;
    drawOverlay();
    showHint(state.focus, screenX(state.focus), screenY(state.focus));
    byId("spoken").textContent = summary(state.focus).join(". ");
  } else if (event.key === "Enter" || event.key === " ") {
    pickFirst(at);
    byId("spoken").textContent = `${nameOf(at)} is the first place`;
  } else if (event.key === "Escape") {
    state.focus = -1;
    showHint(-1);
    drawOverlay();
  } else if (event.key === "+" || event.key === "=") zoom(1.5, screenX(at), screenY(at));
  else if (event.key === "-") zoom(1 / 1.5);
  else if (event.key === "0") wholeCell();
  else return;
  event.preventDefault();
}

function wholeCell() {
  fit();
  drawBase();
}

function watchPointer() {
  let waiting = null, held = null, moved = false;
  const place = (event) => {
    const edge = overlay.getBoundingClientRect();
    return [event.clientX - edge.left, event.clientY - edge.top];
  };
  const frame = () => {
    const { x, y, dx, dy } = waiting;
    waiting = null;
    if (held && moved) {
      eye.x += dx;
      eye.y += dy;
      grid = null;
      drawBase();
      return;
    }
    const row = buildGrid().nearest(x, y);
    if (row !== state.hover) {
      state.hover = row;
      drawOverlay();
    }
    showHint(row, x, y);
  };
  overlay.addEventListener("pointermove", (event) => {
    const [x, y] = place(event), before = waiting || { dx: 0, dy: 0 };
    if (held && Math.hypot(x - held.x0, y - held.y0) > CLICK_PX && event.pointerType !== "touch") moved = true;
    const dx = held ? x - held.x : 0, dy = held ? y - held.y : 0;
    if (held) [held.x, held.y] = [x, y];
    if (!waiting) requestAnimationFrame(frame);
    waiting = { x, y, dx: before.dx + dx, dy: before.dy + dy };
  });
  overlay.addEventListener("pointerdown", (event) => {
    if (event.button !== 0) return;
    const [x, y] = place(event);
    held = { x, y, x0: x, y0: y };
    moved = false;
    overlay.setPointerCapture(event.pointerId);
  });
  overlay.addEventListener("pointerup", (event) => {
    if (!held) return;
    const [x, y] = place(event), clicked = !moved;
    held = null;
    if (!clicked) return;
    if (event.shiftKey) pickSecond(nearestSite(x, y));
    else if (buildGrid().nearest(x, y) >= 0) pickFirst(buildGrid().nearest(x, y));
  });
  overlay.addEventListener("pointercancel", () => { held = null; });
  overlay.addEventListener("pointerleave", () => {
    state.hover = -1;
    showHint(-1);
    drawOverlay();
  });
  overlay.addEventListener("wheel", (event) => {
    if (!event.ctrlKey) return;
    event.preventDefault();
    zoom(Math.exp(-event.deltaY / 300), ...place(event));
  }, { passive: false });
}

function recolour() {
  byId("theme").textContent = isDark() ? "Light page" : "Dark page";
  drawBase();
}

function toPaperOrScreen() {
  box.width = 0;
  resize();
  drawCurves();
}

function begin() {
  for (const id of ["cell", "curves", "table", "theme"]) byId(id).hidden = false;
  state.first = D.sites[0].row;
  if (D.sites.length > 1) {
    state.first = D.sites.at(-1).row;
    state.second = 0;
  }
  state.quantity = QUANTITIES.find((one) => one.key === "sd_mV");
  fillQuantities();
  options(byId("view"), D.views.map((view) => [view.name, `${view.name}: ${view.words}`]), state.view);
  options(byId("kind"), [["", "all kinds"], ...D.kinds.map((kind) => [kind, kindWords(kind)])], "");
  project();
  resize();
  afterPick();
  choose();

  byId("quantity").addEventListener("change", (event) => {
    state.quantity = [...QUANTITIES, ...partnerQuantities()].find((one) => one.key === event.target.value);
    drawBase();
  });
  byId("view").addEventListener("change", (event) => {
    state.view = event.target.value;
    project();
    wholeCell();
  });
  byId("first").addEventListener("change", (event) => pickFirst(Number(event.target.value)));
  byId("second").addEventListener("change", (event) => pickSecond(Number(event.target.value)));
  for (const [id, act] of [["closer", () => zoom(1.5)], ["farther", () => zoom(1 / 1.5)], ["fit", wholeCell], ["download", download]]) {
    byId(id).addEventListener("click", act);
  }
  for (const id of ["which", "kind"]) byId(id).addEventListener("change", choose);
  byId("find").addEventListener("input", choose);
  for (const [id, step] of [["back", -PAGE_ROWS], ["on", PAGE_ROWS]]) {
    byId(id).addEventListener("click", () => {
      list.from += step;
      drawTable();
    });
  }
  byId("theme").addEventListener("click", () => {
    document.documentElement.dataset.theme = isDark() ? "light" : "dark";
    recolour();
  });
  overlay.addEventListener("keydown", onKey);
  watchPointer();
  wishesDark.addEventListener("change", recolour);
  printing.addEventListener("change", toPaperOrScreen);
  addEventListener("beforeprint", () => {
    document.documentElement.dataset.printing = "1";
    toPaperOrScreen();
  });
  addEventListener("afterprint", () => {
    delete document.documentElement.dataset.printing;
    toPaperOrScreen();
  });
  new ResizeObserver(resize).observe(byId("map"));
  let width = byId("curves").clientWidth;
  new ResizeObserver(() => {
    if (byId("curves").clientWidth !== width && !printing.matches) drawCurves();
    width = byId("curves").clientWidth;
  }).observe(byId("curves"));
  byId("theme").textContent = isDark() ? "Light page" : "Dark page";
}

begin();
