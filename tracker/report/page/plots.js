// Small charts as SVG.
function bars(labels, counts, caption, line) {
  const figure = make("figure"), width = 360, height = 170, floor = 140, slot = width / counts.length;
  const top = Math.max(1, ...counts, ...(line ?? []));
  const picture = drawn("svg", { viewBox: `0 0 ${width} ${height}`, role: "img", "aria-label": caption });
  counts.forEach((count, k) => {
    const tall = (120 * count) / top;
    picture.append(drawn("rect", { x: k * slot + slot * 0.08, y: floor - tall, width: slot * 0.84, height: tall, fill: "#0072b2" }));
    if (counts.length < 12) picture.append(drawn("text", { x: (k + 0.5) * slot, y: floor - tall - 4, "text-anchor": "middle" }, count));
  });
  labels.forEach((text, k) => {
    if (k % Math.ceil(labels.length / 8) === 0) picture.append(drawn("text", { x: (k + 0.5) * slot, y: floor + 16, "text-anchor": "middle" }, text));
  });
  if (line) {
    const points = line.map((value, k) => `${(k + 0.5) * slot},${floor - (120 * value) / top}`).join(" ");
    picture.append(drawn("polyline", { points, fill: "none", stroke: "#d55e00", "stroke-width": 2 }));
  }
  figure.append(picture, make("figcaption", caption));
  return figure;
}

function showPlots() {
  const p = data.plots, edges = p.margin_edges;
  $("plots").replaceChildren(
    bars(edges.map((edge, k) => (k + 1 < edges.length ? `${edge}–${edges[k + 1]}` : `≥${edge}`)), p.margin,
      "Margins of chosen pairs, nats. Small margins are where identities break."),
    bars(p.distance_edges.slice(0, -1), p.distance,
      `d² of chosen pairs (bars) and chi-square with ${p.dimension} degrees of freedom (line). Mean ${p.mean_distance}; ${p.dimension} if the noise is honest.`, p.expected),
    bars(p.objects.map(() => ""), p.objects, "Detections a frame, over time."),
  );
}

function showFacts() {
  const part = $("facts"), r = data.run, time = data.timings;
  const words = [
    `${r.counts.frames} frames, ${r.counts.detections} detections, ${r.counts.tracks_confirmed} confirmed tracks, ${r.counts.rejected_rows} rejected rows.`,
    `Input ${r.input.file}, SHA-256 ${r.input.sha256}.`,
    `Certificate: ${r.certificate.components} components in ${r.certificate.frames} frames, largest gap ${r.certificate.largest_gap.toExponential(1)}.`,
    Object.entries(r.versions).map(([name, value]) => `${name} ${value}`).join(", ") + ".",
  ];
  if (time) words.push(`Time a frame: median ${number(time.frame_milliseconds.median)} ms, 99th percentile ${number(time.frame_milliseconds.p99)} ms.`);
  const settings = make("details");
  settings.append(make("summary", "Settings as used"), make("pre", data.settings));
  part.replaceChildren(...words.map((text) => make("p", text, { class: "note" })), settings);
  $("caution").textContent = r.caution;
  const left = data.left_out;
  $("left-out").textContent = left.frames ? `This page leaves out ${left.frames} of ${left.of} frames to stay small: windows around errors and contested decisions come first, as far as they fit, and the rest is thinned.` : "";
}
