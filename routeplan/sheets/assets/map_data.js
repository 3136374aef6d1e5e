// The run behind the page: columns turned back into numbers, and the rulers read between stations.

function sums(steps) {
  let at = 0;
  return steps.map((step) => (step === null ? null : (at += step)));
}

// Web-mercator position of a coordinate in 1e-7 degrees, both from 0 to 1 over the globe.
function world(lon7, lat7) {
  const lat = (lat7 / 1e7) * (Math.PI / 180);
  return [lon7 / 3.6e9 + 0.5, 0.5 - Math.log(Math.tan(Math.PI / 4 + lat / 2)) / (2 * Math.PI)];
}

function worldLine(columns) {
  const lon = sums(columns.lon);
  const lat = sums(columns.lat);
  const x = new Float64Array(lon.length);
  const y = new Float64Array(lon.length);
  lon.forEach((value, i) => { [x[i], y[i]] = world(value, lat[i]); });
  return { x, y };
}

function lonLat(x, y) {
  const lat = 2 * Math.atan(Math.exp((0.5 - y) * 2 * Math.PI)) - Math.PI / 2;
  return [(x - 0.5) * 360, lat * (180 / Math.PI)];
}

// Index of the last entry of a rising list that is not above the value, at least 0.
function lastNotAbove(list, value) {
  let low = 0;
  let high = list.length - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (list[middle] <= value) low = middle; else high = middle - 1;
  }
  return low;
}

function between(xs, ys, x) {
  const i = Math.min(lastNotAbove(xs, x), xs.length - 2);
  if (i < 0) return ys.length ? ys[0] : null;
  if (ys[i] === null || ys[i + 1] === null) return ys[i];
  const span = xs[i + 1] - xs[i];
  return span > 0 ? ys[i] + ((x - xs[i]) / span) * (ys[i + 1] - ys[i]) : ys[i + 1];
}

function readLeg(raw) {
  const stations = raw.stations;
  const points = raw.points;
  const pointLon = sums(points.lon);
  const pointLat = sums(points.lat);
  const pointStation = sums(points.station);
  const ground = sums(raw.ground);
  const leg = {
    name: raw.name, from: raw.from, to: raw.to, cable: raw.cable,
    line: worldLine(raw), ground, length: ground[ground.length - 1] || 0,
    height: sums(raw.height), stretches: raw.stretches, sections: raw.sections,
    stations: {
      ground: sums(stations.ground),
      sheath: sums(stations.sheath), sheathStep: stations.sheathStep,
      glass: sums(stations.glass), glassStep: stations.glassStep,
      section: stations.section,
    },
  };
  leg.hasHeight = leg.height.some((value) => value !== null);
  leg.points = pointStation.map((station, i) => ({
    station, ground: leg.stations.ground[station], code: points.code[i], under: points.under[i],
    name: points.name[i], at: world(pointLon[i], pointLat[i]),
  }));
  return leg;
}

function readRun(raw) {
  return {
    units: raw.units, words: raw.pointWords, codes: Object.keys(raw.pointWords),
    placements: raw.placements, styles: new Map(raw.placements.map((row) => [row.name, row])),
    legs: raw.legs.map(readLeg),
    sites: raw.sites.map(([name, role, lon, lat]) => ({ name, role, at: world(lon, lat) })),
    joints: raw.joints.map(([name, reach, assumed, leg, ground, lon, lat]) => (
      { name, reach, assumed, leg, ground, at: world(lon, lat) })),
    areas: raw.areas.map((area) => ({ ...area, rings: area.rings.map(worldLine) })),
    background: raw.background.map(worldLine),
    power: raw.power.map((row) => ({ ...row, ground: sums(row.ground), loss: sums(row.loss) })),
  };
}

function placementAt(leg, ground) {
  const found = leg.stretches.find(([, start, end]) => ground >= start && ground < end);
  const last = leg.stretches[leg.stretches.length - 1];
  return found ? found[0] : last ? last[0] : "";
}

// All rulers at one ground station; `step` is what they gain there where a loop or tail is stored.
function rulersAt(leg, ground) {
  const s = leg.stations;
  if (!s.ground.length) return null;
  const i = Math.min(lastNotAbove(s.ground, ground), s.ground.length - 1);
  const next = Math.min(i + 1, s.ground.length - 1);
  const span = s.ground[next] - s.ground[i];
  const part = span > 0 ? (ground - s.ground[i]) / span : 0;
  const read = (column, steps) => {
    if (column[i] === null) return { from: null, to: null };
    const start = column[i] + steps[i];
    if (part === 0) return { from: column[i], to: start };
    const value = column[next] === null ? null : start + part * (column[next] - start);
    return { from: value, to: value };
  };
  const sheath = read(s.sheath, s.sheathStep);
  const [section, offset] = leg.sections[s.section[i]] || ["", null];
  return {
    ground, sheath, glass: read(s.glass, s.glassStep), section,
    sectionAt: offset === null || sheath.to === null ? null : sheath.to - offset,
  };
}
