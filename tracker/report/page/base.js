// The data, its rows by frame, and small helpers. Text enters the page by textContent alone.
const all = JSON.parse(document.getElementById("data").textContent);
const $ = (id) => document.getElementById(id);
// Okabe and Ito 2008, "Color Universal Design", without black and the pale yellow.
const PALETTE = ["#0072b2", "#e69f00", "#009e73", "#cc79a7", "#56b4e9", "#d55e00"];
const STATES = ["tentative", "confirmed", "coasting", "ended"];
const view = { run: 0, at: 0, follow: null, detail: null, playing: false };
let data = all[0];
let rows = {};

function make(tag, text = "", attributes = {}) {
  const node = document.createElement(tag);
  node.textContent = text;
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
  return node;
}

function byFrame(columns) {
  const lists = data.frames.map(() => []);
  if (columns) columns.frame.forEach((at, row) => lists[at].push(row));
  return lists;
}

function load(run) {
  data = all[run];
  Object.assign(view, { run, at: 0, follow: null, detail: null, playing: false });
  for (const name of ["tracks", "truth", "detections", "gates", "ledger"]) rows[name] = byFrame(data[name]);
}

const colour = (id) => PALETTE[id % PALETTE.length];
const ink = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

// Where a frame is on the page: itself, or the next one that was kept.
function place(frame) {
  const found = data.frames.findIndex((number) => number >= frame);
  return found < 0 ? data.frames.length - 1 : found;
}

function sentence(item) {
  const who = item.object ? `object ${item.object}` : `track ${item.track}`;
  const what = {
    switch: `${who} changed from track ${item.before} to track ${item.track}`,
    break: `${who} was lost for ${item.rows} rows`,
    miss: `${who} was missed for ${item.rows} rows`,
    "late confirmation": `${who} was tracked ${item.rows} rows late`,
    "false track": `${who} was reported for ${item.rows} rows without an object`,
  }[item.error];
  const detail = item.words ? ` (${item.words})` : "";
  const when = item.cause_frame === item.frame ? "" : ` in frame ${item.cause_frame}`;
  return `Frame ${item.frame}: ${what}. Cause: ${item.cause}${when}${detail}.`;
}
