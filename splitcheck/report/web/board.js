"use strict";
// The page of one board: table, map and one finding from near. Names from files only ever become
// text: elements are made by make(), and nothing here is given markup but the page's own templates.

const SVG = "http://www.w3.org/2000/svg";
const data = JSON.parse(document.getElementById("data").textContent);
const rules = JSON.parse(document.getElementById("rules").textContent).rules;
const LEVELS = ["error", "warning", "note"];
const at = (id) => document.getElementById(id);

function make(tag, attributes, ...children) {
  const element = document.createElement(tag);
  for (const [key, value] of Object.entries(attributes || {})) {
    if (key === "on") for (const [what, call] of Object.entries(value)) element.addEventListener(what, call);
    else if (value !== null && value !== undefined) element.setAttribute(key, value);
  }
  element.append(...children.filter((child) => child !== null && child !== undefined));
  return element;
}
const bdi = (words) => make("bdi", {}, words);

// ---- table ------------------------------------------------------------------------------------

const body = document.querySelector("#table tbody");
const rows = data.findings.map((finding, rank) => {
  const level = finding.waived === null ? finding.level : "waived";
  const row = make("tr", { "aria-selected": "false" },
    make("td", {}, make("button", { type: "button", on: { click: () => choose(rank, true) } }, finding.id)),
    make("td", {}, make("span", { class: `lv ${level}` }, level)),
    make("td", {}, bdi(finding.net), finding.change ? ` (${finding.change})` : null),
    ...["added", "noise", "detour", "mm"].map((key) => make("td", { class: "n" }, finding[key][1])),
    make("td", {}, finding.kind),
    make("td", {}, bdi(finding.layer)),
    make("td", {}, finding.gap));
  row.addEventListener("click", (event) => { if (event.target.tagName !== "BUTTON") choose(rank, false); });
  return row;
});

// What has no number has no way back, or none that is known: worse than any number.
const value = {
  rank: (f, rank) => rank,
  level: (f) => LEVELS.indexOf(f.level),
  net: (f) => f.net, kind: (f) => f.kind, layer: (f) => f.layer, gap: (f) => f.gap,
  mm: (f) => f.mm[0] ?? Infinity, detour: (f) => f.detour[0] ?? Infinity,
  added: (f) => f.added[0] ?? Infinity, noise: (f) => f.noise[0] ?? Infinity,
};
const order = { key: "rank", down: false };

function compare(a, b) {
  const [one, other] = [a, b].map((rank) => value[order.key](data.findings[rank], rank));
  let sign = one === other ? 0 : typeof one === "string"
    ? one.localeCompare(other, "en", { numeric: true }) : one < other ? -1 : 1;
  if (order.down) sign = -sign;
  return sign || a - b;
}

function wanted() {
  const net = at("f-net").value.trim().toLowerCase();
  const gap = at("f-gap").value.trim().toLowerCase();
  const seen = new Set();
  return data.findings.map((_, rank) => rank).filter((rank) => {
    const f = data.findings[rank];
    const level = f.waived === null ? f.level : "waived";
    const fits = (!net || f.net.toLowerCase().includes(net)) && (!gap || f.gap.toLowerCase() === gap)
      && (!at("f-kind").value || f.kind === at("f-kind").value)
      && (!at("f-level").value || level === at("f-level").value)
      && (!at("f-layer").value || f.layer === at("f-layer").value);
    if (!fits) return false;
    if (!at("f-one").checked || !f.gap) return true;
    if (seen.has(f.gap)) return false;
    seen.add(f.gap);
    return true;
  });
}

function list() {
  const shown = wanted();
  const visible = new Set(shown);
  body.replaceChildren(...shown.sort(compare).map((rank) => rows[rank]));
  at("count").textContent = shown.length === data.findings.length
    ? `${shown.length} findings` : `${shown.length} of ${data.findings.length} findings`;
  for (const mark of document.querySelectorAll("#marks .mk")) mark.toggleAttribute("hidden", !visible.has(+mark.dataset.f));
  for (const head of document.querySelectorAll("#table th")) {
    const key = head.firstElementChild.dataset.sort;
    if (key === order.key) head.setAttribute("aria-sort", order.down ? "descending" : "ascending");
    else head.removeAttribute("aria-sort");
  }
}

function options(id, values) {
  for (const name of [...new Set(values)]) at(id).append(make("option", { value: name }, name));
}
options("f-kind", data.findings.map((f) => f.kind));
options("f-level", [...LEVELS.filter((l) => data.findings.some((f) => f.level === l && f.waived === null)),
  ...(data.findings.some((f) => f.waived !== null) ? ["waived"] : [])]);
options("f-layer", data.findings.map((f) => f.layer).sort());
at("f-one").defaultChecked = at("f-one").checked = data.findings.length > 60;
at("filters").addEventListener("input", list);
at("filters").addEventListener("submit", (event) => event.preventDefault());
at("filters").addEventListener("reset", () => setTimeout(() => { at("f-one").checked = false; list(); }));
for (const button of document.querySelectorAll("#table th button")) {
  button.addEventListener("click", () => {
    const key = button.dataset.sort;
    const numbers = ["mm", "detour", "added", "noise"].includes(key);
    order.down = order.key === key ? !order.down : numbers;
    order.key = key;
    list();
  });
}
body.addEventListener("keydown", (event) => {
  const step = { ArrowDown: 1, ArrowUp: -1 }[event.key];
  const row = event.target.closest("tr");
  if (!step || !row) return;
  const next = step > 0 ? row.nextElementSibling : row.previousElementSibling;
  if (next) next.querySelector("button").focus();
  event.preventDefault();
});

// ---- map --------------------------------------------------------------------------------------

const map = at("map");
const whole = map.getAttribute("viewBox").split(" ").map(Number);
let view = [...whole];

function look(box) {
  // never farther out than one and a half boards, never nearer than a tenth of a mm
  const width = Math.min(Math.max(box[2], 10), whole[2] * 1.5);
  const scale = width / box[2];
  view = [box[0] + (box[2] - width) / 2, box[1] + (box[3] * (1 - scale)) / 2, width, box[3] * scale];
  map.setAttribute("viewBox", view.map((n) => +n.toFixed(2)).join(" "));
  // the hatch keeps its size on the screen
  const unit = width / Math.max(map.clientWidth, 1);
  at("hatch-map").setAttribute("patternTransform", `rotate(45) scale(${unit})`);
}
function place(x, y) {
  const matrix = map.getScreenCTM();
  return matrix ? new DOMPoint(x, y).matrixTransform(matrix.inverse()) : { x: view[0], y: view[1] };
}
function zoom(factor, x = view[0] + view[2] / 2, y = view[1] + view[3] / 2) {
  look([x - (x - view[0]) * factor, y - (y - view[1]) * factor, view[2] * factor, view[3] * factor]);
}
function shift(right, down) {
  look([view[0] + right * view[2], view[1] + down * view[3], view[2], view[3]]);
}

map.addEventListener("wheel", (event) => {
  event.preventDefault();
  const { x, y } = place(event.clientX, event.clientY);
  zoom(Math.exp(Math.sign(event.deltaY) * Math.min(Math.abs(event.deltaY), 200) * 0.002), x, y);
}, { passive: false });
map.addEventListener("keydown", (event) => {
  const moves = { ArrowLeft: [-0.15, 0], ArrowRight: [0.15, 0], ArrowUp: [0, -0.15], ArrowDown: [0, 0.15] };
  if (moves[event.key]) shift(...moves[event.key]);
  else if (event.key === "+" || event.key === "=") zoom(0.75);
  else if (event.key === "-") zoom(1 / 0.75);
  else if (event.key === "0") look(whole);
  else return;
  event.preventDefault();
});
const fingers = new Map();
let moved = 0;
map.addEventListener("pointerdown", (event) => {
  if (event.target.classList.contains("mk")) return;
  fingers.set(event.pointerId, event);
  map.setPointerCapture(event.pointerId);
  map.classList.add("drag");
  moved = 0;
});
map.addEventListener("pointermove", (event) => {
  const before = fingers.get(event.pointerId);
  if (!before) return;
  const others = [...fingers.values()].filter((finger) => finger.pointerId !== event.pointerId);
  const was = place(before.clientX, before.clientY), is = place(event.clientX, event.clientY);
  if (others.length) {
    const far = (finger) => Math.hypot(finger.clientX - others[0].clientX, finger.clientY - others[0].clientY);
    const still = place(others[0].clientX, others[0].clientY);
    if (far(event) > 5) zoom(far(before) / far(event), still.x, still.y);
  } else look([view[0] + was.x - is.x, view[1] + was.y - is.y, view[2], view[3]]);
  moved += Math.hypot(event.clientX - before.clientX, event.clientY - before.clientY);
  fingers.set(event.pointerId, event);
});
for (const end of ["pointerup", "pointercancel"]) {
  map.addEventListener(end, (event) => {
    fingers.delete(event.pointerId);
    if (!fingers.size) map.classList.remove("drag");
  });
}
at("marks")?.addEventListener("click", (event) => {
  const mark = event.target.closest(".mk");
  if (mark) choose(+mark.dataset.f, false);
});
at("z-in").addEventListener("click", () => zoom(0.6));
at("z-out").addEventListener("click", () => zoom(1 / 0.6));
at("z-all").addEventListener("click", () => look(whole));

const boxes = [...document.querySelectorAll(".mapbar input")];
for (const box of boxes) box.addEventListener("change", layers);
function layers() {
  for (const box of boxes) at(box.dataset.group)?.toggleAttribute("hidden", !box.checked);
}
function only(...groups) {
  for (const box of boxes) box.checked = groups.includes(box.dataset.group);
  layers();
}

// ---- one finding ------------------------------------------------------------------------------

function choose(rank, go) {
  const finding = data.findings[rank];
  rows.forEach((row, number) => row.setAttribute("aria-selected", String(number === rank)));
  only(`p${data.layers[finding.plane]}`, `t${data.layers[finding.layer]}`);
  for (const path of document.querySelectorAll("#map .gp")) path.toggleAttribute("hidden", path.dataset.g !== finding.gap);
  for (const path of document.querySelectorAll("#map .nt")) path.toggleAttribute("hidden", path.dataset.n !== finding.net);
  const ring = ["on", "in"].map((name) => {
    const path = document.createElementNS(SVG, "path");
    path.setAttribute("class", name);
    path.setAttribute("d", `M${finding.at[0]} ${finding.at[1]}h0`);
    return path;
  });
  at("chosen").replaceChildren(...ring);
  look(finding.zoom);
  tell(finding);
  try { history.replaceState(null, "", `#${finding.id}`); } catch { /* not from every place */ }
  if (go) at("detail").focus({ preventScroll: window.innerWidth >= 1150 });
}

function tell(finding) {
  at("detail-h").replaceChildren(`${finding.id} `, bdi(finding.net), `: ${rules[finding.kind][0]}`);
  const level = finding.waived === null ? finding.level : "waived";
  const number = (name, words) => make("li", {}, make("b", {}, words), make("span", {}, name));
  const parts = [
    make("p", {}, make("span", { class: `lv ${level}` }, level), ` ${finding.place} `,
      make("span", { class: "src" }, `(${finding.source})`)),
    make("p", {}, `${finding.reason}.`),
    finding.waived === null ? null : make("p", {}, `Waived: ${finding.waived}`),
    make("ul", { class: "nums" },
      number("added, nH", finding.added[1]), number("noise, mV", finding.noise[1]),
      number("detour, mm", finding.detour[1]), number("without plane, mm", finding.mm[1])),
  ];
  const near = at(`near-${finding.id}`);
  if (near) parts.push(near.content.cloneNode(true));
  parts.push(
    make("dl", { class: "qa" }, ...finding.more.flatMap(([name, words]) => [make("dt", {}, name), make("dd", {}, words)])),
    make("h3", {}, "What would mend it"), mends(finding), ...sharing(finding), ...journey(finding));
  at("detail-body").replaceChildren(...parts.filter((part) => part));
}

function mends(finding) {
  if (!finding.proposals.length) return make("p", {}, rules[finding.kind][1]);
  return make("ol", { class: "mends" }, ...finding.proposals.map((proposal) => make("li", {},
    `${proposal.words[0].toUpperCase()}${proposal.words.slice(1)}; that leaves `, make("b", {}, proposal.left), ". ",
    proposal.isolation
      ? make("span", { class: "isolation" }, "This gap may be an isolation barrier: ask standards, local code and a qualified engineer first.")
      : null)));
}

function sharing(finding) {
  const same = data.findings.filter((f) => f.gap && f.gap === finding.gap && f !== finding);
  if (!finding.shares.length && !same.length) return [];
  const known = new Map(finding.shares);
  for (const f of same) if (!known.has(f.net) && f.net !== finding.net) known.set(f.net, null);
  const names = [...known].slice(0, 60).flatMap(([net, mutual], row) =>
    [row ? ", " : "", bdi(net), mutual === null ? "" : ` (${mutual} nH)`]);
  const filter = () => { at("filters").reset(); setTimeout(() => { at("f-gap").value = finding.gap; list(); at("list").focus(); }, 5); };
  return [
    make("h3", {}, "Nets that share the gap"),
    make("p", {}, ...names, known.size > 60 ? ` and ${known.size - 60} more` : "", ". In brackets what one induces in the other."),
    make("p", {}, make("button", { type: "button", on: { click: filter } }, `List all over gap ${finding.gap}`)),
  ];
}

function journey(finding) {
  const net = data.nets[finding.net];
  if (!net || !net.legs.length) return [];
  const words = { stretch: "over", bare: "no plane", change: "change of plane", finding: "broken" };
  const legs = net.legs.map(([kind, layer, planes, mm, added, id]) => {
    const rank = data.findings.findIndex((f) => f.id === id);
    const leg = make("li", { class: kind },
      make("b", {}, kind === "finding" && rank >= 0
        ? make("button", { type: "button", on: { click: () => choose(rank, true) } }, id) : bdi(layer)),
      kind === "finding" ? bdi(layer) : "", kind === "finding" ? make("br") : null,
      `${words[kind]} `, bdi(planes), make("br"), kind === "change" ? "" : `${mm} mm`,
      kind === "finding" || added === "no way back" ? make("span", {}, added === "no way back" ? `, ${added}` : `, +${added} nH`) : null);
    leg.style.flexGrow = String(Math.max(mm, 0.5));
    return leg;
  });
  const sum = net.sum === null ? "no way back somewhere" : `${net.sum} nH in all`;
  return [
    make("h3", {}, "Journey of the net"),
    make("p", {}, bdi(finding.net), `: ${net.mm} mm, ${net.n} finding${net.n === 1 ? "" : "s"}, ${sum}.`),
    make("ol", { class: "journey", tabindex: "0", "aria-label": "Stretches of the net and their planes" }, ...legs),
    net.left ? make("p", { class: "limits" }, `and ${net.left} more steps`) : null,
  ];
}

// ---- begin ------------------------------------------------------------------------------------

function named() {
  const rank = data.findings.findIndex((finding) => `#${finding.id}` === location.hash);
  if (rank >= 0) choose(rank, true);
  return rank >= 0;
}
window.addEventListener("hashchange", named);
list();
if (!named()) {
  if (data.findings.length) {
    const first = Math.max(data.findings.findIndex((finding) => finding.waived === null), 0);
    choose(first, false);
    history.replaceState?.(null, "", location.pathname);
  } else at("detail").hidden = true;
  look(whole);
}
