// The run as one Leaflet layer on a canvas, and the search for the nearest place on it.

const LABEL_SIDES = [[1, 0], [-1, 0], [0, -1], [0, 1], [1, -1], [-1, -1], [1, 1], [-1, 1]];

const RunLayer = L.Renderer.extend({
  options: { padding: 0.25, pane: "overlayPane" },

  initialize(run, hidden) {
    L.Renderer.prototype.initialize.call(this);
    this.run = run;
    this.hidden = hidden;
    this.counts = {};
  },

  _initContainer() {
    this._container = document.createElement("canvas");
    this._container.id = "run-canvas";
  },

  _destroyContainer() {
    this._container.remove();
    delete this._container;
  },

  _updatePaths() {},

  // Drawn anew at whole pixels; the usual way leaves the canvas between two pixels, and blurred.
  _reset() {
    this._update();
  },

  _update() {
    if (this._map._animatingZoom && this._bounds) return;
    L.Renderer.prototype._update.call(this);
    const canvas = this._container;
    const size = this._bounds.getSize();
    const density = window.devicePixelRatio || 1;
    L.DomUtil.setPosition(canvas, this._bounds.min);
    canvas.width = Math.round(density * size.x);
    canvas.height = Math.round(density * size.y);
    canvas.style.width = `${size.x}px`;
    canvas.style.height = `${size.y}px`;
    this.paint(canvas.getContext("2d"), density);
  },

  redraw() {
    if (this._map) this._update();
  },

  // Layer coordinates of a world position at the zoom that is shown.
  view() {
    const scale = 256 * 2 ** this._map.getZoom();
    const origin = this._map.getPixelOrigin();
    return { scale, left: origin.x, top: origin.y };
  },

  paint(ctx, density) {
    const { min, max } = this._bounds;
    ctx.setTransform(density, 0, 0, density, -min.x * density, -min.y * density);
    this.box = [min.x - 20, min.y - 20, max.x + 20, max.y + 20];
    this.counts = { lines: 0, site: 0, joint: 0, loop: 0, reach: 0, crossing: 0, names: 0 };
    const busy = new Busy(6);
    const labels = [];
    if (this.shown("grid")) this.paintGrid(ctx);
    if (this.shown("background")) this.paintBackground(ctx);
    if (this.shown("areas")) this.paintAreas(ctx, labels);
    this.run.legs.forEach((leg) => this.paintLeg(ctx, leg, busy));
    this.run.legs.forEach((leg) => this.paintPoints(ctx, leg, busy, labels));
    this.paintJoints(ctx, busy, labels);
    this.paintSites(ctx, busy, labels);
    if (this.shown("names")) this.paintLabels(ctx, busy, labels);
  },

  shown(name) {
    return !this.hidden.has(name);
  },

  place(at, view) {
    return [at[0] * view.scale - view.left, at[1] * view.scale - view.top];
  },

  inside(x, y) {
    return x > this.box[0] && x < this.box[2] && y > this.box[1] && y < this.box[3];
  },

  pixels(line, view) {
    const x = new Float64Array(line.x.length);
    const y = new Float64Array(line.x.length);
    for (let i = 0; i < x.length; i += 1) {
      x[i] = line.x[i] * view.scale - view.left;
      y[i] = line.y[i] * view.scale - view.top;
    }
    return { x, y };
  },

  paintGrid(ctx) {
    const map = this._map;
    const [west, north] = this.corner(this.box[0], this.box[1]);
    const [east, south] = this.corner(this.box[2], this.box[3]);
    const fits = [20, 10, 5, 2, 1, 0.5, 0.2, 0.1, 0.05, 0.02, 0.01, 0.005, 0.002, 0.001, 0.0005];
    const wanted = ((east - west) * 130) / (this.box[2] - this.box[0]);
    const step = fits.filter((each) => each >= wanted).pop() || 20;
    const digits = Math.max(0, Math.ceil(-Math.log10(step)));
    const view = map.getBounds();
    ctx.strokeStyle = "#e0dcd0";
    ctx.fillStyle = "#8b8778";
    ctx.lineWidth = 1;
    ctx.font = `10px ${FONT}`;
    ctx.beginPath();
    for (let n = Math.ceil(west / step); n * step < east; n += 1) {
      const { x } = map.latLngToLayerPoint([view.getCenter().lat, n * step]);
      ctx.moveTo(Math.round(x) + 0.5, this.box[1]);
      ctx.lineTo(Math.round(x) + 0.5, this.box[3]);
      const y = map.latLngToLayerPoint(view.getNorthWest()).y;
      const lon = ((((n * step + 180) % 360) + 360) % 360) - 180;
      ctx.fillText(`${Math.abs(lon).toFixed(digits)}° ${lon < 0 ? "W" : "E"}`, x + 4, y + 12);
    }
    for (let n = Math.ceil(south / step); n * step < north; n += 1) {
      const { y } = map.latLngToLayerPoint([n * step, view.getCenter().lng]);
      ctx.moveTo(this.box[0], Math.round(y) + 0.5);
      ctx.lineTo(this.box[2], Math.round(y) + 0.5);
      const { x, y: top } = map.latLngToLayerPoint(view.getNorthWest());
      const below = map.getSize().y + top - y;
      if (y - top > 24 && below > 70) ctx.fillText(`${Math.abs(n * step).toFixed(digits)}° ${n < 0 ? "S" : "N"}`, x + 44, y - 4);
    }
    ctx.stroke();
  },

  corner(x, y) {
    const view = this.view();
    return lonLat((x + view.left) / view.scale, (y + view.top) / view.scale);
  },

  paintBackground(ctx) {
    const view = this.view();
    ctx.strokeStyle = "#cfcabc";
    ctx.lineWidth = 1;
    ctx.setLineDash([]);
    for (const line of this.run.background) {
      const { x, y } = this.pixels(line, view);
      trace(ctx, visiblePieces(x, y, this.box));
      ctx.stroke();
    }
  },

  paintAreas(ctx, labels) {
    const view = this.view();
    for (const area of this.run.areas) {
      const outline = new Path2D();
      let top = [0, Infinity];
      for (const ring of area.rings) {
        const { x, y } = this.pixels(ring, view);
        x.forEach((px, i) => {
          if (i) outline.lineTo(px, y[i]); else outline.moveTo(px, y[i]);
          if (y[i] < top[1]) top = [px, y[i]];
        });
        outline.closePath();
      }
      ctx.save();
      ctx.clip(outline, "evenodd");
      this.hatch(ctx, area.kind === "avoid");
      ctx.restore();
      ctx.setLineDash(area.kind === "avoid" ? [] : [6, 4]);
      ctx.lineWidth = 1.2;
      ctx.strokeStyle = "#7b7566";
      ctx.stroke(outline);
      labels.push({ text: `${area.name} (${area.kind})`, x: top[0], y: top[1], size: 11, gap: 6 });
    }
    ctx.setLineDash([]);
  },

  // Slanted lines; crossed both ways where the ground is to be avoided.
  hatch(ctx, crossed) {
    const [left, top, right, bottom] = this.box;
    const rise = bottom - top;
    ctx.lineWidth = 1;
    ctx.strokeStyle = "#c9c3b2";
    ctx.beginPath();
    for (let x = Math.floor((left - rise) / 9) * 9; x < right + rise; x += 9) {
      ctx.moveTo(x, bottom);
      ctx.lineTo(x + rise, top);
      if (crossed) {
        ctx.moveTo(x, top);
        ctx.lineTo(x + rise, bottom);
      }
    }
    ctx.stroke();
  },

  paintLeg(ctx, leg, busy) {
    const { x, y } = this.pixels(leg.line, this.view());
    leg.pixels = { x, y };
    for (const [placement, start, end] of leg.stretches) {
      if (!this.shown(`way ${placement}`)) continue;
      const part = this.part(leg, start, end);
      const pieces = visiblePieces(part.x, part.y, this.box);
      strokeLine(ctx, pieces, this.run.styles.get(placement), GROUND);
      busy.takeLine(pieces);
      this.counts.lines += pieces.length;
    }
  },

  // Pixels of a leg between two ground stations, its ends set between vertices.
  part(leg, start, end) {
    const { x, y } = leg.pixels;
    const first = lastNotAbove(leg.ground, start) + 1;
    const last = lastNotAbove(leg.ground, end);
    const xs = [between(leg.ground, x, start), ...x.subarray(first, last + 1)];
    const ys = [between(leg.ground, y, start), ...y.subarray(first, last + 1)];
    xs.push(between(leg.ground, x, end));
    ys.push(between(leg.ground, y, end));
    return { x: xs, y: ys };
  },

  paintPoints(ctx, leg, busy, labels) {
    const view = this.view();
    const apart = new Busy(9);
    const order = ["loop", "crossing", "reach"];
    const layerOf = (point) => {
      const code = this.run.codes[point.code];
      return order.includes(code) ? code : ["joint", "site"].includes(code) ? "" : "reach";
    };
    for (const layer of order) {
      for (const point of leg.points) {
        if (layerOf(point) !== layer || !this.shown(layer)) continue;
        const [x, y] = this.place(point.at, view);
        if (!this.inside(x, y)) continue;
        if (layer !== "crossing" && !apart.isFree(x - 4, y - 4, x + 4, y + 4)) continue;
        apart.take(x - 4, y - 4, x + 4, y + 4);
        if (layer === "loop") drawPoint(ctx, "loop", x, y);
        const code = layer === "loop" ? point.under : point.code;
        if (code >= 0) drawPoint(ctx, this.run.codes[code], x, y);
        else dot(ctx, x, y, 1.8, INK);
        busy.take(x - 8, y - 8, x + 8, y + 8);
        labels.push({ text: point.name, x, y, size: 10.5, gap: 9, isMinor: true });
        this.counts[layer] += 1;
      }
    }
  },

  paintJoints(ctx, busy, labels) {
    if (!this.shown("joint")) return;
    const view = this.view();
    for (const joint of this.run.joints) {
      const [x, y] = this.place(joint.at, view);
      if (!this.inside(x, y)) continue;
      drawPoint(ctx, joint.assumed ? "assumed_joint" : "joint", x, y);
      busy.take(x - 8, y - 8, x + 8, y + 8);
      labels.push({ text: joint.name, x, y, size: 12, gap: 11, weight: 700, rank: 1 });
      this.counts.joint += 1;
    }
  },

  paintSites(ctx, busy, labels) {
    if (!this.shown("site")) return;
    const view = this.view();
    for (const site of this.run.sites) {
      const [x, y] = this.place(site.at, view);
      if (!this.inside(x, y)) continue;
      drawPoint(ctx, site.role === "transmitter" ? "transmitter" : "site", x, y);
      busy.take(x - 9, y - 11, x + 9, y + 9);
      labels.push({ text: site.name, x, y, size: 13.5, gap: 13, weight: 700, rank: 2 });
      this.counts.site += 1;
    }
  },

  paintLabels(ctx, busy, labels) {
    ctx.textBaseline = "middle";
    const { min, max } = this._map.getPixelBounds();
    const origin = this._map.getPixelOrigin();
    this.seen = [min.x - origin.x, min.y - origin.y, max.x - origin.x, max.y - origin.y];
    const most = max.x - min.x > 640 ? 42 : 22;
    this.closed = new Busy(6);
    this.keepClear([busy, this.closed]);
    labels.sort((a, b) => (b.rank || 0) - (a.rank || 0));
    for (const label of labels) {
      if (!label.text) continue;
      const text = label.text.length > most ? `${label.text.slice(0, most - 1)}…` : label.text;
      ctx.font = `${label.weight || 500} ${label.size}px ${FONT}`;
      const width = ctx.measureText(text).width;
      const spot = this.freeSpot(busy, label, width);
      if (!spot) continue;
      ctx.textAlign = "left";
      ctx.fillStyle = label.isMinor ? MUTED : INK;
      haloText(ctx, text, spot[0], spot[1], GROUND);
      for (const grid of [busy, this.closed]) {
        grid.take(spot[0] - 2, spot[1] - label.size / 2, spot[0] + width + 2, spot[1] + label.size / 2);
      }
      this.counts.names += 1;
    }
  },

  // No name is written under the legend or the buttons.
  keepClear(grids) {
    const holder = this._map.getContainer();
    const home = holder.getBoundingClientRect();
    for (const part of holder.querySelectorAll(".legend, .leaflet-bar")) {
      const box = part.getBoundingClientRect();
      const start = this._map.containerPointToLayerPoint([box.left - home.left, box.top - home.top]);
      for (const grid of grids) {
        grid.take(start.x - 6, start.y - 6, start.x + box.width + 6, start.y + box.height + 6);
      }
    }
  },

  // Where a name fits beside its point; a joint or site is named even across a way.
  freeSpot(busy, label, width) {
    const half = label.size / 2 + 1;
    const spots = LABEL_SIDES.map(([dx, dy]) => [
      label.x + dx * label.gap - (dx < 0 ? width : dx === 0 ? width / 2 : 0),
      label.y + dy * (label.gap + half),
    ]);
    const [left, top, right, bottom] = this.seen;
    const inView = spots.filter(([x, y]) => (
      x > left + 3 && x + width < right - 3 && y - half > top && y + half < bottom));
    const found = inView.find(([x, y]) => busy.isFree(x, y - half, x + width, y + half));
    if (found || !label.rank) return found;
    return inView.find(([x, y]) => this.closed.isFree(x, y - half, x + width, y + half));
  },

  // The place on any shown way nearest to a layer point, within `reach` pixels.
  nearest(point, reach) {
    let best = null;
    let bound = reach * reach;
    this.run.legs.forEach((leg, number) => {
      const { x, y } = leg.pixels;
      for (let i = 1; i < x.length; i += 1) {
        const dx = x[i] - x[i - 1];
        const dy = y[i] - y[i - 1];
        const square = dx * dx + dy * dy;
        const along = (point.x - x[i - 1]) * dx + (point.y - y[i - 1]) * dy;
        const part = square > 0 ? Math.min(1, Math.max(0, along / square)) : 0;
        const offX = x[i - 1] + part * dx - point.x;
        const offY = y[i - 1] + part * dy - point.y;
        const off = offX * offX + offY * offY;
        if (off < bound) {
          bound = off;
          const ground = leg.ground[i - 1] + part * (leg.ground[i] - leg.ground[i - 1]);
          best = { leg: number, ground };
        }
      }
    });
    return best && this.snapped(best);
  },

  // Moved onto a point of the leg where one lies within six pixels along the way.
  snapped(spot) {
    const leg = this.run.legs[spot.leg];
    const [x, y] = this.spotPixels(leg, spot.ground);
    let bound = 6;
    for (const point of leg.points) {
      const [px, py] = this.spotPixels(leg, point.ground);
      const off = Math.hypot(px - x, py - y);
      if (off < bound) {
        bound = off;
        spot = { leg: spot.leg, ground: point.ground, point };
      }
    }
    return spot;
  },

  spotPixels(leg, ground) {
    return [between(leg.ground, leg.pixels.x, ground), between(leg.ground, leg.pixels.y, ground)];
  },

  spotLatLng(spot) {
    const leg = this.run.legs[spot.leg];
    const x = between(leg.ground, leg.line.x, spot.ground);
    const [lon, lat] = lonLat(x, between(leg.ground, leg.line.y, spot.ground));
    return [lat, lon];
  },
});
