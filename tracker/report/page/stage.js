// The player: one frame on the canvas, in a view that zooms and moves.
const canvas = $("stage");
const camera = { x: 0, y: 0, scale: 1 };
const layers = { Boxes: true, Trails: true, Numbers: true, Truth: true, Detections: false, Gate: true };
let extent = [0, 0, 1, 1];

function measure() {
  let [left, top, right, bottom] = [Infinity, Infinity, -Infinity, -Infinity];
  for (const part of [data.tracks, data.detections, data.truth]) {
    if (!part) continue;
    part.x.forEach((x, k) => {
      const w = part.width ? part.width[k] / 2 : 0, h = part.height ? part.height[k] / 2 : 0;
      left = Math.min(left, x - w); right = Math.max(right, x + w);
      top = Math.min(top, part.y[k] - h); bottom = Math.max(bottom, part.y[k] + h);
    });
  }
  extent = left < right && top < bottom ? [left, top, right, bottom] : [0, 0, 1, 1];
}

function fit() {
  const width = canvas.clientWidth, ratio = window.devicePixelRatio || 1;
  const [left, top, right, bottom] = extent;
  const height = Math.max(200, Math.min(560, width * Math.max(0.4, (bottom - top) / (right - left))));
  canvas.style.height = `${height}px`;
  canvas.width = width * ratio; canvas.height = height * ratio;
  camera.scale = 0.94 * Math.min(width / (right - left), height / (bottom - top));
  camera.x = (left + right) / 2; camera.y = (top + bottom) / 2;
}

const flip = () => (data.kind === "point" ? -1 : 1); // points have y upwards
const toX = (x) => canvas.clientWidth / 2 + (x - camera.x) * camera.scale;
const toY = (y) => canvas.clientHeight / 2 + flip() * (y - camera.y) * camera.scale;

function shape(pen, part, k) {
  if (part.width) {
    const w = part.width[k] * camera.scale, h = part.height[k] * camera.scale;
    pen.strokeRect(toX(part.x[k]) - w / 2, toY(part.y[k]) - h / 2, w, h);
  } else {
    pen.beginPath(); pen.arc(toX(part.x[k]), toY(part.y[k]), 5, 0, 7); pen.stroke();
  }
}

function trails(pen, here) {
  const last = new Map(here.map((k) => [data.tracks.id[k], k]));
  for (let at = view.at - 1; at >= Math.max(0, view.at - 25); at--) {
    for (const k of rows.tracks[at]) {
      const id = data.tracks.id[k], next = last.get(id);
      if (next === undefined) continue;
      pen.strokeStyle = colour(id); pen.globalAlpha = 0.55; pen.lineWidth = 1.5;
      pen.beginPath(); pen.moveTo(toX(data.tracks.x[k]), toY(data.tracks.y[k]));
      pen.lineTo(toX(data.tracks.x[next]), toY(data.tracks.y[next])); pen.stroke();
      last.set(id, k);
    }
  }
  pen.globalAlpha = 1;
}

// Where the gate lets a detection with the noise of the nearest one lie: S = P + R, d² at P_G.
function gate(pen) {
  const g = data.gates, k = rows.gates[view.at].find((row) => g.id[row] === view.follow);
  if (k === undefined || data.gate_distance === null) return;
  const d = data.detections, away = (row) => Math.hypot(d.x[row] - g.x[k], d.y[row] - g.y[k]);
  const near = rows.detections[view.at].reduce((best, row) => (best < 0 || away(row) < away(best) ? row : best), -1);
  const xx = g.xx[k] + (near < 0 ? 0 : d.xx[near]), yy = g.yy[k] + (near < 0 ? 0 : d.yy[near]);
  const half = (xx + yy) / 2, root = Math.hypot((xx - yy) / 2, g.xy[k]);
  const reach = (value) => Math.sqrt(Math.max(value, 0) * data.gate_distance) * camera.scale;
  pen.strokeStyle = ink("--alarm"); pen.setLineDash([6, 3]); pen.beginPath();
  pen.ellipse(toX(g.x[k]), toY(g.y[k]), reach(half + root), reach(half - root),
    flip() * 0.5 * Math.atan2(2 * g.xy[k], xx - yy), 0, 7);
  pen.stroke(); pen.setLineDash([]);
}

function draw() {
  const ratio = window.devicePixelRatio || 1, pen = canvas.getContext("2d");
  pen.setTransform(ratio, 0, 0, ratio, 0, 0);
  pen.clearRect(0, 0, canvas.clientWidth, canvas.clientHeight);
  const t = data.tracks, here = rows.tracks[view.at];
  if (layers.Truth && data.truth) {
    pen.strokeStyle = ink("--soft"); pen.lineWidth = 1; pen.setLineDash([2, 3]);
    for (const k of rows.truth[view.at]) shape(pen, data.truth, k);
    pen.setLineDash([]);
  }
  if (layers.Detections) {
    pen.strokeStyle = ink("--ink"); pen.lineWidth = 0.7;
    for (const k of rows.detections[view.at]) shape(pen, data.detections, k);
  }
  if (layers.Trails) trails(pen, here);
  if (layers.Gate && view.follow !== null) gate(pen);
  pen.font = "600 13px system-ui, sans-serif";
  for (const k of here) {
    const followed = t.id[k] === view.follow;
    pen.strokeStyle = colour(t.id[k]); pen.lineWidth = followed ? 4 : 2;
    pen.setLineDash([[2, 3], [], [8, 5], [1, 5]][t.state[k]]);
    if (layers.Boxes) shape(pen, t, k);
    pen.setLineDash([]);
    if (!layers.Numbers) continue;
    const x = toX(t.x[k]) - (t.width ? t.width[k] * camera.scale / 2 : -8);
    const y = toY(t.y[k]) - (t.height ? t.height[k] * camera.scale / 2 : 0) - 4;
    pen.lineWidth = 4; pen.strokeStyle = ink("--card"); pen.strokeText(t.id[k], x, y);
    pen.fillStyle = ink("--ink"); pen.fillText(t.id[k], x, y);
  }
}

function nearest(x, y) {
  let best = null, least = 40;
  for (const k of rows.tracks[view.at]) {
    const away = Math.hypot(toX(data.tracks.x[k]) - x, toY(data.tracks.y[k]) - y);
    if (away < least) [best, least] = [data.tracks.id[k], away];
  }
  return best;
}

function zoom(factor) { camera.scale *= factor; draw(); }
