// Verdict, causes, the decision panel and the lanes.
const number = (value, digits = 2) => value === null ? "–" : typeof value === "number" ? value.toFixed(digits) : value;

function showVerdict() {
  const s = data.scores, lead = $("worst"), go = $("worst-go"), list = $("scores");
  list.replaceChildren();
  if (!s) {
    lead.textContent = "No truth was given: there are no scores, but contested decisions are marked.";
  } else {
    const worst = data.findings[data.worst];
    lead.textContent = worst ? `Worst identity error. ${sentence(worst)}` : "No identity errors.";
    const percent = (v) => (v === null ? "–" : `${(100 * v).toFixed(1)}%`);
    for (const [name, value] of [["HOTA", percent(s.hota)], ["IDF1", percent(s.idf1)], ["MOTA", percent(s.mota)],
      ["Switches", s.switches], ["Misses", s.misses], ["False positives", s.false_positives], ["Objects", s.objects]]) {
      const pair = make("div"); pair.append(make("dt", name), make("dd", String(value))); list.append(pair);
    }
  }
  go.hidden = !s || data.worst === null;
  go.onclick = () => showFinding(data.findings[data.worst]);
}

function showCauses() {
  const groups = new Map(), part = $("causes");
  for (const item of data.findings) {
    const key = `${item.error}: ${item.cause}`;
    groups.set(key, [...(groups.get(key) ?? []), item]);
  }
  part.replaceChildren();
  $("causes-part").hidden = !groups.size;
  const rank = (list) => (list[0].error === "switch" ? 1e6 : 0) + list.length;
  const sorted = [...groups].sort((a, b) => rank(b[1]) - rank(a[1]));
  const most = Math.max(...sorted.map(([, list]) => list.length));
  for (const [name, list] of sorted) {
    const row = make("div", "", { class: "cause" }), track = make("div"), bar = make("div", "", { class: "bar" });
    bar.style.width = `${(100 * list.length) / most}%`;
    track.append(bar);
    row.append(make("span", name), track, make("b", String(list.length)));
    const moments = make("div", "", { class: "moments" });
    for (const item of list.slice(0, 12)) {
      const jump = make("button", `frame ${item.frame}`, { type: "button", title: sentence(item) });
      jump.onclick = () => showFinding(item);
      moments.append(jump);
    }
    if (list.length > 12) moments.append(make("span", `and ${list.length - 12} more (Next error)`, { class: "note" }));
    part.append(row, moments);
    if (list[0].setting) part.append(make("div", `Setting: ${list[0].setting}`, { class: "note" }));
  }
}

function whyNot(k) {
  const l = data.ledger;
  if (l.chosen[k]) return "chosen";
  return l.force_cost[k] === null ? "not chosen" : `+${number(l.force_cost[k])} nats if forced`;
}

function showDecision() {
  const l = data.ledger, part = $("decision"), item = view.detail;
  part.replaceChildren();
  part.append(make("h3", view.follow === null ? "Decision" : `Track ${view.follow}, frame ${data.frames[view.at]}`));
  if (item) {
    part.append(make("p", sentence(item), { class: "why" }));
    const jump = (text, frame, id) => {
      const button = make("button", text, { type: "button" });
      button.onclick = () => { view.follow = id ?? view.follow; goTo(place(frame)); };
      part.append(button, " ");
    };
    if (item.before !== null) jump(`Where track ${item.before} lost it`, item.cause_frame, item.before);
    jump("Where it shows", item.frame, item.track ?? item.before);
  }
  if (view.follow === null) { part.append(make("p", "Click an object to see how its detection was decided.", { class: "note" })); return; }
  const mine = rows.ledger[view.at].filter((k) => l.track[k] === view.follow);
  const near = new Set(mine.map((k) => `${l.tier[k]} ${l.component[k]}`));
  const rivals = rows.ledger[view.at].filter((k) => l.track[k] !== view.follow && near.has(`${l.tier[k]} ${l.component[k]}`));
  if (!mine.length) { part.append(make("p", "The ledger has no row of this track here.", { class: "note" })); return; }
  const margin = mine.map((k) => l.margin[k]).find((value) => value !== null);
  if (margin !== undefined) {
    const odds = typeof margin === "number" ? (margin > 13 ? "over 400,000" : Math.exp(margin).toPrecision(3)) : "infinite";
    part.append(make("p", `Margin ${number(margin)} nats, odds ${odds}:1.${mine.some((k) => l.contested[k]) ? " Contested." : ""}`));
  }
  const table = (title, list) => {
    if (!list.length) return;
    const grid = make("table"), box = make("div", "", { class: "wide" }), head = make("tr");
    for (const name of [title, "Cost", "d²", "IoU", "Outcome"]) head.append(make("th", name, { scope: "col" }));
    grid.append(head);
    for (const k of list) {
      const row = make("tr", "", { class: l.chosen[k] ? "chosen" : "", "data-row": k });
      const what = l.detection[k] === null ? "miss" : `detection ${l.detection[k]}`;
      const who = list === mine ? what : `${l.track[k] === null ? "new track" : `track ${l.track[k]}`}, ${what}`;
      row.append(make("td", who), make("td", number(l.cost[k], 4)), make("td", number(l.distance[k], 4)), make("td", number(l.overlap[k])), make("td", whyNot(k)));
      grid.append(row);
    }
    box.append(grid); part.append(box);
  };
  table("Candidate", mine);
  table("Rivals", rivals);
  part.append(make("p", "Costs in nats, as the ledger has them. Rivals share gated detections with this track. At ledger level 'contested' unchosen candidates are kept only where a margin is small.", { class: "note" }));
}

function drawn(tag, attributes, text) {
  const node = document.createElementNS("http://www.w3.org/2000/svg", tag);
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
  if (text !== undefined) node.textContent = text;
  return node;
}

function showLanes() {
  const t = data.tracks, part = $("lanes"), width = Math.max(300, part.clientWidth - 16), lanes = new Map();
  t.id.forEach((id, k) => lanes.set(id, [...(lanes.get(id) ?? []), k]));
  const shown = [...lanes].slice(0, 300), step = 18, edge = 44;
  const x = (at) => edge + ((width - edge - 8) * at) / Math.max(1, data.frames.length - 1);
  const picture = drawn("svg", { width, height: shown.length * step + 6, role: "img", "aria-label": "Tracks over time" });
  const contested = new Map();
  data.ledger.contested.forEach((yes, k) => {
    if (yes && data.ledger.track[k] !== null) contested.set(`${data.ledger.track[k]} ${data.ledger.frame[k]}`, k);
  });
  shown.forEach(([id, list], lane) => {
    const y = lane * step + 12;
    picture.append(drawn("text", { x: edge - 8, y: y + 4, "text-anchor": "end" }, id));
    let start = list[0];
    list.forEach((k, n) => {
      const next = list[n + 1];
      if (next !== undefined && t.state[next] === t.state[start]) return;
      const style = [{ "stroke-width": 1.5 }, { "stroke-width": 5 }, { "stroke-width": 3, "stroke-dasharray": "4 3" }, {}][t.state[start]];
      picture.append(drawn("line", { x1: x(t.frame[start]), x2: x(t.frame[next ?? k]), y1: y, y2: y, stroke: colour(id), ...style }));
      start = next;
    });
    for (const at of new Set(list.map((k) => t.frame[k]))) {
      if (contested.has(`${id} ${at}`)) picture.append(drawn("circle", { cx: x(at), cy: y, r: 3, fill: "currentColor" }));
    }
    for (const item of data.findings) {
      if (item.error === "switch" && item.track === id) {
        const at = x(place(item.frame));
        picture.append(drawn("path", { d: `M${at - 5} ${y + 6}h10l-5 -11z`, fill: "currentColor" }));
      }
    }
  });
  const needle = drawn("line", { id: "needle", y1: 0, y2: shown.length * step + 6, stroke: "currentColor" });
  picture.append(needle);
  picture.onclick = (event) => {
    const box = picture.getBoundingClientRect(), lane = shown[Math.floor((event.clientY - box.top - 3) / step)];
    if (lane) view.follow = lane[0];
    view.detail = null;
    goTo(Math.round(((event.clientX - box.left - edge) / (width - edge - 8)) * (data.frames.length - 1)));
  };
  part.replaceChildren(picture);
  if (lanes.size > 300) part.append(make("p", `${lanes.size - 300} later tracks have no lane here.`, { class: "note" }));
  showLanes.x = x;
}
