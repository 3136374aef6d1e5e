// The strip chart: height and loss against ground metres, with the ways and joints under it.

const MARGIN = { left: 46, right: 48, top: 26, bottom: 40 };

function niceStep(span, count) {
  const rough = span / count;
  const power = 10 ** Math.floor(Math.log10(rough));
  return [1, 2, 2.5, 5, 10].map((each) => each * power).find((each) => each >= rough * (1 - 1e-9));
}

// Decimals that a multiple of the step needs to be told from the next.
function decimals(step) {
  return [0, 1, 2, 3].find((digits) => Math.abs(step * 10 ** digits % 1) < 1e-9) ?? 4;
}

function niceRange(low, high, count) {
  const step = niceStep(Math.max(high - low, 1e-6), count);
  return { low: Math.floor(low / step) * step, high: Math.ceil(high / step) * step || step, step };
}

class Strip {
  constructor(canvas, cursor, run, onMove) {
    Object.assign(this, { canvas, cursor, run, onMove, legNumber: 0, curveNumber: 0, ground: null });
    const moved = (event) => {
      const x = event.clientX - canvas.getBoundingClientRect().left;
      const ground = Math.min(this.leg.length, Math.max(0, this.groundAt(x)));
      const near = this.leg.points.find((point) => Math.abs(this.xAt(point.ground) - x) < 2);
      this.onMove(this.legNumber, near ? near.ground : ground, near);
    };
    cursor.addEventListener("pointermove", (event) => {
      if (event.pointerType === "mouse" || event.buttons) moved(event);
    });
    cursor.addEventListener("pointerdown", moved);
    cursor.addEventListener("keydown", (event) => {
      const side = { ArrowLeft: -1, ArrowRight: 1 }[event.key];
      if (!side) return;
      event.preventDefault();
      const at = (this.ground || 0) + (side * this.leg.length) / (event.shiftKey ? 20 : 200);
      this.onMove(this.legNumber, Math.min(this.leg.length, Math.max(0, at)));
    });
  }

  get leg() {
    return this.run.legs[this.legNumber];
  }

  get curves() {
    return this.run.power.filter((row) => row.leg === this.legNumber);
  }

  get plot() {
    return {
      left: MARGIN.left, right: this.width - MARGIN.right,
      top: MARGIN.top, bottom: this.height - MARGIN.bottom,
    };
  }

  xAt(ground) {
    const { left, right } = this.plot;
    return left + (ground / (this.leg.length || 1)) * (right - left);
  }

  groundAt(x) {
    const { left, right } = this.plot;
    return ((x - left) / (right - left)) * this.leg.length;
  }

  fit(canvas) {
    const density = window.devicePixelRatio || 1;
    const box = canvas.parentElement.getBoundingClientRect();
    this.width = box.width;
    this.height = box.height;
    canvas.width = Math.round(box.width * density);
    canvas.height = Math.round(box.height * density);
    const ctx = canvas.getContext("2d");
    ctx.setTransform(density, 0, 0, density, 0, 0);
    return ctx;
  }

  paint() {
    const ctx = this.fit(this.canvas);
    ctx.fillStyle = PAPER;
    ctx.fillRect(0, 0, this.width, this.height);
    if (!this.leg) return;
    this.rows = Math.max(2, Math.round((this.plot.bottom - this.plot.top) / 32));
    this.paintAxis(ctx);
    this.paintHeight(ctx);
    this.paintJoints(ctx);
    this.paintLoss(ctx);
    this.paintWays(ctx);
    this.paintCursor();
  }

  paintAxis(ctx) {
    const { left, right, bottom } = this.plot;
    const step = niceStep(this.leg.length / 1e6, Math.max(2, (right - left) / 95));
    ctx.font = `11px ${FONT}`;
    ctx.fillStyle = MUTED;
    ctx.textAlign = "center";
    ctx.textBaseline = "alphabetic";
    ctx.strokeStyle = "#d8d4c8";
    ctx.lineWidth = 1;
    ctx.beginPath();
    const digits = decimals(step);
    for (let n = 0; n * step * 1e6 <= this.leg.length; n += 1) {
      const x = Math.round(this.xAt(n * step * 1e6)) + 0.5;
      ctx.moveTo(x, bottom + 18);
      ctx.lineTo(x, bottom + 22);
      ctx.fillText((n * step).toFixed(digits), x, bottom + 34);
    }
    ctx.stroke();
    ctx.textAlign = "right";
    ctx.fillText("km", this.width - 6, bottom + 34);
  }

  paintHeight(ctx) {
    const { left, right, top, bottom } = this.plot;
    ctx.textAlign = "left";
    if (!this.leg.hasHeight) {
      ctx.fillText("No heights in the input.", left + 6, top + 14);
      return;
    }
    const known = this.leg.height.filter((value) => value !== null).map((value) => value / 10);
    const range = niceRange(known.reduce((a, b) => Math.min(a, b)),
      known.reduce((a, b) => Math.max(a, b)), this.rows);
    this.rows = Math.round((range.high - range.low) / range.step);
    const yAt = (m) => bottom - ((m - range.low) / (range.high - range.low)) * (bottom - top);
    ctx.textAlign = "right";
    ctx.textBaseline = "middle";
    ctx.fillStyle = MUTED;
    for (let m = range.low; m <= range.high + 1e-9; m += range.step) {
      const y = Math.round(yAt(m)) + 0.5;
      ctx.strokeStyle = "#ebe7dc";
      ctx.beginPath();
      ctx.moveTo(left, y);
      ctx.lineTo(right, y);
      ctx.stroke();
      ctx.fillText(String(Math.round(m)), left - 6, y);
    }
    ctx.textBaseline = "alphabetic";
    ctx.textAlign = "left";
    ctx.fillText("Height, m", 6, 12);
    this.traceHeight(ctx, yAt, bottom);
  }

  traceHeight(ctx, yAt, bottom) {
    const area = new Path2D();
    const edge = new Path2D();
    let open = null;
    this.leg.height.forEach((value, i) => {
      const x = this.xAt(this.leg.ground[i]);
      if (value === null) return;
      const y = yAt(value / 10);
      if (open === null) { area.moveTo(x, bottom); edge.moveTo(x, y); } else edge.lineTo(x, y);
      area.lineTo(x, y);
      open = x;
    });
    area.lineTo(open, bottom);
    area.closePath();
    ctx.fillStyle = "#e4e0d2";
    ctx.fill(area);
    ctx.strokeStyle = "#8b8778";
    ctx.lineWidth = 1.3;
    ctx.setLineDash([]);
    ctx.stroke(edge);
  }

  paintLoss(ctx) {
    const curve = this.curves[this.curveNumber];
    if (!curve) return;
    const { right, top, bottom } = this.plot;
    const most = curve.loss.reduce((a, b) => Math.max(a, b), 0) / 1000;
    const step = niceStep(Math.max(most, 0.1), this.rows);
    const yAt = (db) => bottom - (db / (step * this.rows)) * (bottom - top);
    ctx.beginPath();
    curve.ground.forEach((ground, i) => ctx.lineTo(this.xAt(ground), yAt(curve.loss[i] / 1000)));
    ctx.lineWidth = 4;
    ctx.strokeStyle = PAPER;
    ctx.stroke();
    ctx.lineWidth = 2;
    ctx.strokeStyle = INK;
    ctx.stroke();
    ctx.fillStyle = INK;
    ctx.textBaseline = "middle";
    ctx.textAlign = "left";
    for (let n = 0; n <= this.rows; n += 1) {
      ctx.fillText((n * step).toFixed(decimals(step)), right + 6, yAt(n * step));
    }
    ctx.textBaseline = "alphabetic";
    ctx.textAlign = "right";
    ctx.fillText("Loss, dB", this.width - 6, 12);
  }

  paintJoints(ctx) {
    const { top, bottom } = this.plot;
    const busy = new Busy(4);
    busy.take(0, 0, 64, 8);
    busy.take(this.width - 64, 0, this.width, 8);
    for (const joint of this.run.joints) {
      if (joint.leg !== this.legNumber) continue;
      const x = Math.round(this.xAt(joint.ground)) + 0.5;
      ctx.strokeStyle = "#8b8778";
      ctx.lineWidth = 1;
      ctx.setLineDash([2, 3]);
      ctx.beginPath();
      ctx.moveTo(x, top);
      ctx.lineTo(x, bottom);
      ctx.stroke();
      ctx.setLineDash([]);
      ctx.font = `600 11px ${FONT}`;
      const half = ctx.measureText(joint.name).width / 2 + 3;
      if (!busy.isFree(x - half, 0, x + half, 8)) continue;
      busy.take(x - half, 0, x + half, 8);
      ctx.fillStyle = INK;
      ctx.textAlign = "center";
      haloText(ctx, joint.name, x, 14, PAPER);
    }
    ctx.font = `11px ${FONT}`;
  }

  paintWays(ctx) {
    const y = this.plot.bottom + 10;
    for (const [placement, start, end] of this.leg.stretches) {
      const piece = [this.xAt(start), y, Math.max(this.xAt(end), this.xAt(start) + 1), y];
      strokeLine(ctx, [piece], this.run.styles.get(placement), PAPER);
    }
    for (const point of this.leg.points) {
      const [code, x] = [this.run.codes[point.code], this.xAt(point.ground)];
      if (code === "loop") ring(ctx, x, this.plot.bottom - 5, 2.5);
      if (code === "crossing") {
        drawCross(ctx, x, this.plot.bottom - 5, [[2.5, 2.5], [2.5, -2.5]], [[3.5, PAPER], [1.4, INK]]);
      }
    }
    for (const joint of this.run.joints) {
      if (joint.leg !== this.legNumber) continue;
      drawPoint(ctx, joint.assumed ? "assumed_joint" : "joint", this.xAt(joint.ground), y);
    }
  }

  paintCursor() {
    const ctx = this.fit(this.cursor);
    if (this.ground === null || !this.leg) return;
    const x = this.xAt(this.ground);
    ctx.strokeStyle = POINTER;
    ctx.lineWidth = 1.5;
    ctx.beginPath();
    ctx.moveTo(x, this.plot.top - 4);
    ctx.lineTo(x, this.plot.bottom + 20);
    ctx.stroke();
  }

  show(legNumber, ground) {
    const changed = legNumber !== this.legNumber;
    this.legNumber = legNumber;
    this.ground = ground;
    if (changed) this.paint(); else this.paintCursor();
  }
}
