// Moving through time, keys, pointer, themes.
function goTo(at) {
  view.at = Math.max(0, Math.min(data.frames.length - 1, at));
  $("scrub").value = view.at;
  const time = data.times[view.at];
  $("clock").textContent = `frame ${data.frames[view.at]}${time === null ? "" : `, ${time.toFixed(2)} s`}`;
  draw();
  showDecision();
  const needle = $("needle");
  if (needle) { const x = showLanes.x(view.at); needle.setAttribute("x1", x); needle.setAttribute("x2", x); }
}

function showFinding(item) {
  play(false);
  view.detail = item;
  view.follow = item.error === "switch" ? item.before : item.track ?? item.before;
  goTo(place(item.cause_frame));
  $("scene").scrollIntoView();
}

function next(frames) {
  const places = [...new Set(frames.map(place))].sort((a, b) => a - b);
  return places.find((at) => at > view.at) ?? places[0];
}

function nextError() {
  const at = next(data.findings.map((item) => item.cause_frame));
  if (at !== undefined) showFinding(data.findings.find((item) => place(item.cause_frame) === at));
}

function nextContested() {
  const at = next(data.contested);
  if (at === undefined) return;
  play(false);
  const l = data.ledger, row = rows.ledger[at].find((k) => l.contested[k] && l.track[k] !== null);
  view.detail = null;
  if (row !== undefined) view.follow = l.track[row];
  goTo(at);
}

let due = 0;
function play(on) {
  view.playing = on;
  $("play").textContent = on ? "Pause" : "Play";
  due = performance.now();
  if (on) requestAnimationFrame(tick);
}

function tick(now) {
  if (!view.playing) return;
  const wait = 1000 / (data.run.rate_hz || 10) / Number($("speed").value);
  if (now - due >= wait) {
    due = now;
    if (view.at + 1 >= data.frames.length) return play(false);
    goTo(view.at + 1);
  }
  requestAnimationFrame(tick);
}

function start(run) {
  load(run);
  play(false);
  $("name").textContent = data.name;
  $("scrub").max = data.frames.length - 1;
  measure(); fit();
  showVerdict(); showCauses(); showLanes(); showPlots(); showFacts();
  goTo(0);
}

const keys = {
  " ": () => play(!view.playing), ArrowLeft: () => goTo(view.at - 1), ArrowRight: () => goTo(view.at + 1),
  e: nextError, c: nextContested, "+": () => zoom(1.25), "-": () => zoom(0.8),
  0: () => { fit(); draw(); }, Escape: () => { view.follow = view.detail = null; goTo(view.at); },
};
document.addEventListener("keydown", (event) => {
  const busy = event.target.closest("select, input, summary") || (event.key === " " && event.target.closest("button"));
  const action = keys[event.key.length === 1 ? event.key.toLowerCase() : event.key];
  if (busy || !action || event.ctrlKey || event.metaKey || event.altKey) return;
  event.preventDefault();
  action();
});
$("play").onclick = keys[" "];
$("back").onclick = keys.ArrowLeft;
$("forth").onclick = keys.ArrowRight;
$("next-error").onclick = nextError;
$("next-contested").onclick = nextContested;
$("fit").onclick = keys[0];
$("scrub").oninput = (event) => goTo(Number(event.target.value));
$("theme").onclick = () => {
  const dark = getComputedStyle(document.documentElement).colorScheme === "dark";
  document.documentElement.dataset.theme = dark ? "light" : "dark";
  draw();
};
for (const name of Object.keys(layers)) {
  const label = make("label"), box = make("input", "", { type: "checkbox" });
  box.checked = layers[name];
  box.onchange = () => { layers[name] = box.checked; draw(); };
  label.append(box, ` ${name}`);
  $("layers").append(label);
}
let held = null;
canvas.addEventListener("pointerdown", (event) => { held = { x: event.clientX, y: event.clientY, moved: false }; canvas.setPointerCapture(event.pointerId); });
canvas.addEventListener("pointermove", (event) => {
  if (!held) return;
  const dx = event.clientX - held.x, dy = event.clientY - held.y;
  if (!held.moved && Math.hypot(dx, dy) < 4) return;
  camera.x -= dx / camera.scale; camera.y -= (flip() * dy) / camera.scale;
  held = { x: event.clientX, y: event.clientY, moved: true };
  draw();
});
canvas.addEventListener("pointerup", (event) => {
  if (held && !held.moved) {
    const box = canvas.getBoundingClientRect();
    view.follow = nearest(event.clientX - box.left, event.clientY - box.top);
    view.detail = null;
    goTo(view.at);
  }
  held = null;
});
canvas.addEventListener("wheel", (event) => { event.preventDefault(); zoom(event.deltaY < 0 ? 1.15 : 0.87); }, { passive: false });
window.addEventListener("resize", () => { fit(); showLanes(); goTo(view.at); });
matchMedia("(prefers-color-scheme: dark)").addEventListener("change", draw);
all.forEach((one, k) => $("runs").append(make("option", one.name, { value: k })));
$("choose").hidden = all.length < 2;
$("runs").onchange = (event) => start(Number(event.target.value));
start(0);
