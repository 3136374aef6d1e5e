// The page: legend with layer switches, readings under the pointer, map and strip chart together.

const FEET_PER_M = 1 / 0.3048;

function grouped(value, digits) {
  const [whole, part] = Math.abs(value).toFixed(digits).split(".");
  const text = whole.replace(/\B(?=(\d{3})+$)/g, "\u202f") + (part ? `.${part}` : "");
  return value < 0 && Number(text.replace(/\D/g, "")) ? `\u2212${text}` : text;
}

function metresText(mm, units) {
  if (mm === null) return "\u2013";
  const text = `${grouped(mm / 1000, 1)}\u00a0m`;
  return units === "us" ? `${text}\n(${grouped((mm / 1000) * FEET_PER_M, 0)}\u00a0ft)` : text;
}

function rangeText(pair, units) {
  if (pair.from === null || pair.from === pair.to) return metresText(pair.to, units);
  return `${grouped(pair.from / 1000, 1)}\u2013${metresText(pair.to, units)}`;
}

function element(tag, name, text) {
  const made = document.createElement(tag);
  if (name) made.className = name;
  if (text !== undefined) made.textContent = text;
  return made;
}

function sample(draw) {
  const canvas = element("canvas", "sample");
  const density = Math.max(2, window.devicePixelRatio || 1);
  canvas.width = 40 * density;
  canvas.height = 22 * density;
  const ctx = canvas.getContext("2d");
  ctx.scale(density, density);
  draw(ctx);
  return canvas;
}

// One row of the legend: a switch, what the thing looks like, its name, how much of it there is.
function legendRow(layer, key, draw, word, amount) {
  const row = element("label", "row");
  const box = element("input");
  box.type = "checkbox";
  box.checked = !layer.hidden.has(key);
  box.dataset.layer = key;
  box.addEventListener("change", () => {
    if (box.checked) layer.hidden.delete(key); else layer.hidden.add(key);
    layer.redraw();
  });
  row.append(box, sample(draw), element("span", "word", word), element("span", "amount", amount));
  return row;
}

function legendRows(layer) {
  const run = layer.run;
  const rows = [];
  const line = (style) => (ctx) => strokeLine(ctx, [[2, 11, 38, 11]], style, PAPER);
  for (const style of run.placements) {
    const km = `${grouped(style.total / 1e6, 2)}\u00a0km`;
    rows.push(legendRow(layer, `way ${style.name}`, line(style), style.word, km));
  }
  rows.push(element("hr"));
  const point = (...codes) => (ctx) => codes.forEach((code, i) => (
    drawPoint(ctx, code, codes.length > 1 ? 10 + i * 20 : 20, code === "transmitter" ? 13 : 11)));
  const roles = run.sites.map((site) => (site.role === "transmitter" ? "transmitter" : "site"));
  const siteCodes = ["site", "transmitter"].filter((code) => roles.includes(code));
  const siteWord = siteCodes.map((code) => run.words[code]).join(", ");
  if (run.sites.length) rows.push(legendRow(layer, "site", point(...siteCodes), siteWord, run.sites.length));
  const assumed = run.joints.filter((joint) => joint.assumed).length;
  const jointCodes = ["joint", "assumed_joint"].slice(
    assumed === run.joints.length ? 1 : 0, assumed ? 2 : 1);
  const jointWord = { 1: run.words[jointCodes[0]], 2: "joint, place assumed" }[jointCodes.length];
  if (run.joints.length) {
    rows.push(legendRow(layer, "joint", point(...jointCodes), jointWord, run.joints.length));
  }
  rows.push(...pointRows(layer, point));
  return rows;
}

function pointRows(layer, point) {
  const run = layer.run;
  const all = run.legs.flatMap((leg) => leg.points);
  const rows = [];
  const countOf = (code) => all.filter((each) => run.codes[each.code] === code).length;
  for (const code of ["loop", "crossing"]) {
    if (!countOf(code)) continue;
    const draw = (ctx) => { point(code)(ctx); if (code === "loop") dot(ctx, 20, 11, 1.8, INK); };
    rows.push(legendRow(layer, code, draw, run.words[code], countOf(code)));
  }
  const reach = all.filter((each) => each.code >= run.codes.indexOf("handhole"));
  if (reach.length) {
    rows.push(legendRow(layer, "reach", () => {}, "reach points", reach.length));
    const seen = new Set(all.map((each) => (each.under >= 0 ? each.under : each.code)));
    for (const code of run.codes.slice(run.codes.indexOf("handhole"))) {
      if (!seen.has(run.codes.indexOf(code))) continue;
      const row = element("div", "row sub");
      row.append(element("span"), sample(point(code)), element("span", "word", run.words[code]));
      rows.push(row);
    }
  }
  return rows;
}

function otherRows(layer) {
  const run = layer.run;
  const line = (colour) => (ctx) => {
    ctx.strokeStyle = colour;
    ctx.beginPath();
    ctx.moveTo(2, 11.5);
    ctx.lineTo(38, 11.5);
    ctx.stroke();
  };
  const area = (ctx) => {
    ctx.strokeStyle = "#7b7566";
    ctx.strokeRect(7.5, 3.5, 25, 15);
    ctx.beginPath();
    for (let x = 8; x < 33; x += 6) { ctx.moveTo(x, 18); ctx.lineTo(Math.min(x + 12, 32), 5); }
    ctx.strokeStyle = "#c9c3b2";
    ctx.stroke();
  };
  const rows = [element("hr")];
  if (run.areas.length) rows.push(legendRow(layer, "areas", area, "areas", run.areas.length));
  if (run.background.length) {
    rows.push(legendRow(layer, "background", line("#b8b2a2"), "background", ""));
  }
  const names = (ctx) => { ctx.font = `600 12px ${FONT}`; ctx.fillText("Ab", 12, 15); };
  const switches = [
    legendRow(layer, "names", names, "names", ""),
    legendRow(layer, "grid", line("#cfcabc"), "degrees", ""),
  ];
  switches.forEach((row) => row.classList.add("switch"));
  return [...rows, ...switches];
}

function addLegend(map, layer) {
  const control = L.control({ position: "topright" });
  control.onAdd = () => {
    const box = element("details", "legend");
    box.open = map.getSize().x > 640;
    box.append(element("summary", "", "Legend"), ...legendRows(layer), ...otherRows(layer));
    box.addEventListener("toggle", () => layer.redraw());
    L.DomEvent.disableClickPropagation(box);
    L.DomEvent.disableScrollPropagation(box);
    return box;
  };
  control.addTo(map);
}

class Readings {
  constructor(run) {
    this.run = run;
    this.cells = {};
    for (const cell of document.querySelectorAll("[data-reading]")) {
      this.cells[cell.dataset.reading] = cell;
    }
  }

  set(name, text) {
    if (this.cells[name]) this.cells[name].textContent = text;
  }

  show(spot, strip) {
    const leg = this.run.legs[spot.leg];
    const units = this.run.units;
    const placement = placementAt(leg, spot.ground);
    const style = this.run.styles.get(placement);
    const rulers = rulersAt(leg, spot.ground);
    const height = leg.hasHeight ? between(leg.ground, leg.height, spot.ground) : null;
    this.set("way", style ? style.word : placement);
    this.set("leg", leg.name);
    this.set("ground", metresText(spot.ground, units));
    this.set("sheath", rulers ? rangeText(rulers.sheath, units) : "\u2013");
    this.set("glass", rulers ? rangeText(rulers.glass, units) : "\u2013");
    this.set("section", rulers && rulers.sectionAt !== null
      ? `${rulers.section} \u00b7 ${metresText(rulers.sectionAt, units)}` : "\u2013");
    this.set("height", height === null ? "\u2013" : metresText(height * 100, units));
    const curve = strip.curves[strip.curveNumber];
    const loss = curve ? between(curve.ground, curve.loss, spot.ground) : null;
    this.set("loss", loss === null ? "\u2013" : `${grouped(loss / 1000, 2)}\u00a0dB`);
  }
}

function pointText(run, point) {
  const code = run.codes[point.code];
  const words = [run.words[code]];
  if (point.under >= 0 && code !== run.codes[point.under]) words.push(run.words[run.codes[point.under]]);
  return point.name ? `${point.name} \u00b7 ${words.join(", ")}` : words.join(", ");
}

function fillSelect(select, words, onChange) {
  select.replaceChildren(...words.map((word, i) => {
    const option = element("option", "", word);
    option.value = String(i);
    return option;
  }));
  select.hidden = words.length < 2;
  select.onchange = () => onChange(Number(select.value));
}

function addPointer(map) {
  const icon = L.divIcon({ className: "pointer", iconSize: [18, 18] });
  const marker = L.marker([0, 0], { icon, interactive: false, keyboard: false });
  const tip = L.tooltip({ direction: "top", offset: [0, -12], className: "tip", opacity: 1 });
  return {
    show(at, text) {
      marker.setLatLng(at).addTo(map);
      if (!text) { tip.remove(); return; }
      tip.setLatLng(at).setContent(element("span", "", text)).addTo(map);
    },
  };
}

// Until the reader moves the map it shows the whole run, whatever becomes of the window; paper has
// its own size too, and what is seen is drawn anew for it and put back afterwards.
function keepFitted(map, strip, fit) {
  let isMoved = false;
  let seen = null;
  const holder = map.getContainer();
  for (const name of ["pointerdown", "wheel", "keydown"]) {
    holder.addEventListener(name, () => { isMoved = true; }, { passive: true });
  }
  const resize = () => {
    map.invalidateSize({ animate: false });
    if (!isMoved) fit(); else if (seen) map.fitBounds(seen, { animate: false });
    strip.paint();
  };
  new ResizeObserver(resize).observe(holder);
  window.addEventListener("beforeprint", () => {
    seen = map.getBounds().pad(-0.02);
    document.body.classList.add("printing");
    resize();
  });
  window.addEventListener("afterprint", () => {
    document.body.classList.remove("printing");
    resize();
    seen = null;
  });
}

function showRun(map) {
  const run = readRun(JSON.parse(document.getElementById("run-data").textContent));
  const layer = new RunLayer(run, new Set());
  const readings = new Readings(run);
  const pointer = addPointer(map);
  const select = (name) => document.querySelector(`select[data-choice="${name}"]`);
  let last = null;
  const strip = new Strip(document.getElementById("strip-chart"), document.getElementById("strip-pointer"),
    run, (leg, ground, point) => {
      const spot = { leg, ground, point };
      show(spot);
      const at = layer.spotLatLng(spot);
      if (!map.getBounds().pad(-0.02).contains(at)) map.panTo(at, { animate: false });
    });
  const chooseCurves = () => fillSelect(select("curve"), strip.curves.map((row) => (
    row.wavelength ? `${row.circuit}, ${row.wavelength} nm` : row.circuit)), (number) => {
    strip.curveNumber = number;
    strip.paint();
    if (last) show(last);
  });
  function show(spot) {
    if (spot.leg !== strip.legNumber) strip.curveNumber = 0;
    const isNew = spot.leg !== strip.legNumber;
    last = spot;
    strip.show(spot.leg, spot.ground);
    if (isNew) { chooseCurves(); select("leg").value = String(spot.leg); }
    readings.show(spot, strip);
    pointer.show(layer.spotLatLng(spot), spot.point ? pointText(run, spot.point) : "");
  }
  function fit() {
    const boxes = [...run.legs.map((leg) => leg.line), ...run.sites.map(({ at }) => ({ x: [at[0]], y: [at[1]] }))];
    const corners = L.latLngBounds([]);
    for (const { x, y } of boxes) {
      for (let i = 0; i < x.length; i += 1) corners.extend(lonLat(x[i], y[i]).reverse());
    }
    if (!corners.isValid()) return;
    const legend = map.getSize().x > 640 ? 230 : 24;
    map.fitBounds(corners, { paddingTopLeft: [44, 44], paddingBottomRight: [legend, 44], animate: false });
  }
  const begin = () => { if (run.legs.length) readings.show({ leg: 0, ground: 0 }, strip); };
  const seek = (event, reach) => {
    const spot = layer.nearest(event.layerPoint, reach);
    if (spot) show(spot);
  };
  map.setMinZoom(2).setMaxZoom(20);
  fit();
  addLegend(map, layer);
  layer.addTo(map);
  fillSelect(select("leg"), run.legs.map((leg) => leg.name), (leg) => show({ leg, ground: 0 }));
  chooseCurves();
  map.on("mousemove", (event) => seek(event, 60));
  map.on("click", (event) => seek(event, 90));
  strip.paint();
  keepFitted(map, strip, fit);
  begin();
  window.runSheet = { map, layer, run, strip, fit, show, last: () => last };
  requestAnimationFrame(() => { document.documentElement.dataset.ready = "yes"; });
}
