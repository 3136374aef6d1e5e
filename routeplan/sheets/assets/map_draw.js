// The drawing of ways and points on a canvas, the same on map, strip chart and legend.

const INK = "#1c2326";
const MUTED = "#5d6a70";
const PAPER = "#fffefb";
const GROUND = "#f3f1ea";
const POINTER = "#b5124b";
const FONT = 'ui-sans-serif, system-ui, "Segoe UI", "Helvetica Neue", Arial, sans-serif';

// Part of a segment inside the box [left, top, right, bottom], or null.
function clipped(x0, y0, x1, y1, box) {
  let t0 = 0;
  let t1 = 1;
  const dx = x1 - x0;
  const dy = y1 - y0;
  const sides = [[-dx, x0 - box[0]], [dx, box[2] - x0], [-dy, y0 - box[1]], [dy, box[3] - y0]];
  for (const [p, q] of sides) {
    if (p === 0) {
      if (q < 0) return null;
    } else if (p < 0) {
      t0 = Math.max(t0, q / p);
    } else {
      t1 = Math.min(t1, q / p);
    }
  }
  return t0 > t1 ? null : [x0 + t0 * dx, y0 + t0 * dy, x0 + t1 * dx, y0 + t1 * dy];
}

// Pieces of a polyline inside the box, points nearer than a pixel and a half left out.
function visiblePieces(x, y, box) {
  const pieces = [];
  let piece = null;
  let lastX = x[0];
  let lastY = y[0];
  for (let i = 1; i < x.length; i += 1) {
    const near = Math.abs(x[i] - lastX) + Math.abs(y[i] - lastY) < 1.5;
    if (near && i < x.length - 1) continue;
    const cut = clipped(lastX, lastY, x[i], y[i], box);
    if (cut) {
      const joined = piece && piece[piece.length - 2] === cut[0] && piece[piece.length - 1] === cut[1];
      if (!joined) pieces.push(piece = [cut[0], cut[1]]);
      piece.push(cut[2], cut[3]);
    }
    lastX = x[i];
    lastY = y[i];
  }
  return pieces;
}

function trace(ctx, pieces) {
  ctx.beginPath();
  for (const piece of pieces) {
    ctx.moveTo(piece[0], piece[1]);
    for (let i = 2; i < piece.length; i += 2) ctx.lineTo(piece[i], piece[i + 1]);
  }
}

// Short strokes across a line every `gap` pixels: the poles of an aerial way, without claiming any.
function traceTicks(ctx, pieces, gap, half) {
  ctx.beginPath();
  for (const piece of pieces) {
    let left = gap / 2;
    for (let i = 2; i < piece.length; i += 2) {
      const [x0, y0, x1, y1] = piece.slice(i - 2, i + 2);
      const length = Math.hypot(x1 - x0, y1 - y0);
      if (length === 0) continue;
      const ux = (x1 - x0) / length;
      const uy = (y1 - y0) / length;
      for (; left <= length; left += gap) {
        const x = x0 + ux * left;
        const y = y0 + uy * left;
        ctx.moveTo(x - uy * half, y + ux * half);
        ctx.lineTo(x + uy * half, y - ux * half);
      }
      left -= length;
    }
  }
}

function strokeLine(ctx, pieces, style, ground) {
  ctx.save();
  ctx.lineJoin = "round";
  ctx.lineCap = style.form === "dots" ? "round" : "butt";
  const pass = (colour, width, dash) => {
    ctx.strokeStyle = colour;
    ctx.lineWidth = width;
    ctx.setLineDash(dash || []);
    trace(ctx, pieces);
    ctx.stroke();
  };
  pass(ground, style.width + 3);
  if (style.form === "double" || style.form === "rail") {
    pass(style.colour, style.width);
    pass(ground, style.width - 3);
    if (style.form === "rail") pass(style.colour, 1.2, style.dash);
  } else {
    pass(style.colour, style.width, style.dash);
  }
  if (style.form === "ticks") {
    ctx.setLineDash([]);
    ctx.lineWidth = 1.6;
    traceTicks(ctx, pieces, 13, 4.5);
    ctx.stroke();
  }
  ctx.restore();
}

function polygon(ctx, x, y, corners) {
  ctx.beginPath();
  corners.forEach(([dx, dy], i) => (i ? ctx.lineTo(x + dx, y + dy) : ctx.moveTo(x + dx, y + dy)));
  ctx.closePath();
}

const OUTLINES = {
  handhole: [[-3.5, -3.5], [3.5, -3.5], [3.5, 3.5], [-3.5, 3.5]],
  maintenance_hole: [[-5, -5], [5, -5], [5, 5], [-5, 5]],
  cabinet: [[-3.5, -5.5], [3.5, -5.5], [3.5, 5.5], [-3.5, 5.5]],
  pedestal: [[0, -5], [4.6, 3.6], [-4.6, 3.6]],
  building: [[-5, 5], [-5, -1], [0, -6], [5, -1], [5, 5]],
};

function drawOutline(ctx, code, x, y) {
  polygon(ctx, x, y, OUTLINES[code]);
  ctx.fillStyle = PAPER;
  ctx.fill();
  ctx.lineWidth = 1.5;
  ctx.strokeStyle = INK;
  ctx.stroke();
  if (code === "maintenance_hole") dot(ctx, x, y, 1.8, INK);
}

function dot(ctx, x, y, radius, colour) {
  ctx.beginPath();
  ctx.arc(x, y, radius, 0, 2 * Math.PI);
  ctx.fillStyle = colour;
  ctx.fill();
}

function ring(ctx, x, y, radius) {
  for (const [width, colour] of [[4, PAPER], [1.7, INK]]) {
    ctx.beginPath();
    ctx.arc(x, y, radius, 0, 2 * Math.PI);
    ctx.lineWidth = width;
    ctx.strokeStyle = colour;
    ctx.stroke();
  }
}

function drawCross(ctx, x, y, arms, widths) {
  for (const [width, colour] of widths) {
    ctx.beginPath();
    for (const [dx, dy] of arms) {
      ctx.moveTo(x - dx, y - dy);
      ctx.lineTo(x + dx, y + dy);
    }
    ctx.lineWidth = width;
    ctx.strokeStyle = colour;
    ctx.stroke();
  }
}

function drawSolid(ctx, x, y, corners, fill) {
  polygon(ctx, x, y, corners);
  ctx.lineJoin = "miter";
  ctx.lineWidth = 4;
  ctx.strokeStyle = PAPER;
  ctx.stroke();
  ctx.fillStyle = fill;
  ctx.fill();
  ctx.lineWidth = 1.7;
  ctx.strokeStyle = INK;
  ctx.stroke();
}

const DIAMOND = [[0, -7], [7, 0], [0, 7], [-7, 0]];

function drawPoint(ctx, code, x, y) {
  ctx.setLineDash([]);
  if (code === "site") drawSolid(ctx, x, y, [[-6, -6], [6, -6], [6, 6], [-6, 6]], INK);
  else if (code === "transmitter") drawSolid(ctx, x, y, [[0, -11], [7.5, 6], [-7.5, 6]], INK);
  else if (code === "joint") drawSolid(ctx, x, y, DIAMOND, INK);
  else if (code === "assumed_joint") drawSolid(ctx, x, y, DIAMOND, PAPER);
  else if (code === "loop") ring(ctx, x, y, 7);
  else if (code === "crossing") {
    drawCross(ctx, x, y, [[4.5, 4.5], [4.5, -4.5]], [[5, PAPER], [2, INK]]);
  } else if (code === "pole") {
    dot(ctx, x, y, 4.4, PAPER);
    dot(ctx, x, y, 3, INK);
  } else if (OUTLINES[code]) drawOutline(ctx, code, x, y);
  else drawCross(ctx, x, y, [[4, 0], [0, 4]], [[4.5, PAPER], [1.6, INK]]);
}

function haloText(ctx, text, x, y, halo) {
  ctx.lineJoin = "round";
  ctx.lineWidth = 4;
  ctx.strokeStyle = halo;
  ctx.strokeText(text, x, y);
  ctx.fillText(text, x, y);
}

// Cells that something is drawn in already, so that no name is put over a way or another name.
class Busy {
  constructor(cell) {
    this.cell = cell;
    this.cells = new Set();
  }

  key(x, y) {
    return Math.floor(x / this.cell) * 1e6 + Math.floor(y / this.cell);
  }

  isFree(left, top, right, bottom) {
    for (let x = left; x < right + this.cell; x += this.cell) {
      for (let y = top; y < bottom + this.cell; y += this.cell) {
        if (this.cells.has(this.key(Math.min(x, right), Math.min(y, bottom)))) return false;
      }
    }
    return true;
  }

  take(left, top, right, bottom) {
    for (let x = left; x < right + this.cell; x += this.cell) {
      for (let y = top; y < bottom + this.cell; y += this.cell) {
        this.cells.add(this.key(Math.min(x, right), Math.min(y, bottom)));
      }
    }
  }

  takeLine(pieces) {
    for (const piece of pieces) {
      for (let i = 2; i < piece.length; i += 2) {
        const dx = piece[i] - piece[i - 2];
        const dy = piece[i + 1] - piece[i - 1];
        const count = Math.ceil(Math.hypot(dx, dy) / this.cell) || 1;
        for (let k = 0; k <= count; k += 1) {
          this.cells.add(this.key(piece[i - 2] + (dx * k) / count, piece[i - 1] + (dy * k) / count));
        }
      }
    }
  }
}
