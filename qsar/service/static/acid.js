// One acid: ruler, what it says, the drawing to change, the trail, and how the number comes about.

import { Axis, Ruler, bar, dot, hidePeek, lane, peek, verdict } from "./axis.js";
import { bench } from "./bench.js";
import { ask, askJson, dark, el, failed, go, number, pack, percent, picture, save, say, signed, unpack } from "./util.js";

let ruler = null;
let running = null;

// Steps of the trail are [SMILES, what was done, position of the step it came from].
export async function showAcid(main, query) {
  running?.abort();
  running = new AbortController();
  const { signal } = running;
  const coverage = Number(query.get("c")) || 0.9;
  hidePeek();
  if (!ruler || !main.contains(ruler.node)) {
    main.replaceChildren(el("p", { class: "loading" }, "Working …"));
  }
  main.setAttribute("aria-busy", "true");
  say("Working …");
  try {
    const trail = query.get("t") ? await unpack(query.get("t")) : [[query.get("s"), "", null]];
    const index = Math.min(Number(query.get("i")) || 0, trail.length - 1);
    const smiles = trail[index][0];
    const step = Number(query.get("k")) || 1;
    const parameters = new URLSearchParams({ smiles, coverage, step });
    const [view, rows] = await Promise.all([
      askJson(`acid?${parameters}`, undefined, { signal }),
      trail.length > 1 ? trailRows(trail, coverage, signal) : null,
    ]);
    render(main, { view, trail, rows, index, coverage, step });
  } catch (problem) {
    ruler = null;
    failed(main, problem, () => showAcid(main, query));
  } finally {
    main.removeAttribute("aria-busy");
  }
}

const trailRows = async (trail, coverage, signal) =>
  (await askJson("predict", { coverage, structures: trail.map(([smiles, did], i) => ({ id: `${i + 1} ${did || "start"}`, smiles })) },
    { signal })).rows;

export async function openStep(state, change) {
  const next = { ...state, ...change };
  const single = next.trail.length === 1;
  go("acid", {
    s: single ? next.trail[0][0] : null,
    t: single ? null : await pack(next.trail),
    i: next.index || null,
    k: next.step > 1 ? next.step : null,
    c: next.coverage === 0.9 ? null : next.coverage,
  });
}

function axisFor({ view, rows }) {
  const values = [];
  for (const step of view.steps) {
    values.push(step.low, step.high, step.pka, step.measured ?? step.pka);
  }
  const shown = view.steps[view.shown_step - 1];
  values.push(shown.parent_pka, ...shown.neighbours.map((near) => near.pka));
  let running = shown.parent_pka;
  for (const line of shown.contributions) values.push((running += line.contribution));
  for (const row of rows || []) if (row.step === view.shown_step) values.push(row.low, row.high);
  return new Axis(values);
}

function render(main, state) {
  const { view } = state;
  const axis = axisFor(state);
  if (!ruler || !main.contains(ruler.node)) {
    ruler = new Ruler((step) => openStep(ruler.state, { step }));
    main.replaceChildren(el("div", { id: "ruler" }, ruler.node), el("div", { id: "rest" }));
  }
  ruler.state = state;
  ruler.show(view, axis, (smiles) => openStep(state, { trail: [[smiles, "", null]], index: 0, step: 1 }));
  main.querySelector("#rest").replaceChildren(
    saying(state),
    bench(state),
    trailPart(state, axis),
    walk(view, axis),
    next(state),
  );
  document.title = `${title(view)}: pKa ${view.steps.map((s) => number(s.pka)).join(", ")}`;
  say(`${title(view)}: ${view.steps.map((s) => sentence(s, view.steps.length)).join("; ")}`);
}

const title = (view) => view.name || (view.smiles.length > 60 ? "This acid" : view.smiles);

function sentence(step, steps) {
  const which = steps > 1 ? `step ${step.step}, ` : "";
  return `${which}pKa ${number(step.pka)}, ${step.domain}`;
}

// What the ruler says, in words. The measured value comes first where there is one.
function saying({ view, coverage }) {
  return el("section", { class: "saying", "aria-label": "Result" },
    el("h1", {}, title(view)), title(view) === view.smiles ? null : el("p", { class: "smiles" }, view.smiles),
    el("ol", { class: view.steps.length > 1 ? "steps" : "steps single" }, view.steps.map((step) => el("li", { class: step.step === view.shown_step ? "shown" : null },
      step.measured === null ? null : el("p", { class: "measured" },
        el("strong", {}, `Measured ${number(step.measured)}`),
        ` ± ${number(step.measured_uncertainty)}, ${step.measured_source}.`,
        step.pka_without === null ? "" : ` Predicted without this value: ${number(step.pka_without)}.`),
      el("p", {}, el("strong", {}, `Predicted ${number(step.pka)}`),
        `, ${percent(coverage)} interval ${number(step.low)} to ${number(step.high)}. `, verdict(step.domain)),
      el("ul", { class: "reasons" }, step.verdict_reasons.map((reason) => el("li", {}, reason)))))),
    view.notes.length ? el("div", { class: "note" }, el("h2", {}, "Mind"), view.notes.map((note) => el("p", {}, capital(note)))) : null);
}

const capital = (text) => text[0].toUpperCase() + text.slice(1) + (text.endsWith(".") ? "" : ".");

function trailPart(state, axis) {
  const { trail, rows, index, view } = state;
  if (trail.length === 1) {
    return el("section", { class: "trail empty", "aria-label": "Trail" }, el("h2", {}, "Trail"),
      el("p", {}, "Choose a place on the drawing and give it another group: each step is kept here, and you can go back to any of them."));
  }
  const of = (i) => {
    const own = rows.filter((row) => row.id === `${i + 1} ${trail[i][1] || "start"}`);
    return own.find((row) => row.step === view.shown_step) || own[0];
  };
  return el("section", { class: "trail", "aria-label": "Trail" },
    el("div", { class: "headrow" }, el("h2", {}, "Trail"), exports(() => rows, () => trail.map(([smiles, did], i) => ({ id: `${i + 1} ${did || "start"}`, smiles })), state.coverage)),
    el("ol", { class: "lanes" }, trail.map(([smiles, did, from], i) => {
      const row = of(i);
      const known = row && row.pka !== null;
      const before = from === null || from === undefined ? null : of(from);
      const moved = known && before && before.pka !== null ? row.pka - before.pka : null;
      const here = i === index;
      const things = known ? [
        moved === null ? null : el("span", { class: `move ${moved < 0 ? "lowers" : "raises"}`, left: axis.at(Math.min(row.pka, before.pka)), width: axis.span(Math.min(row.pka, before.pka), Math.max(row.pka, before.pka)), "aria-hidden": "true" }),
        bar(axis, row.low, row.high), dot(axis, row.pka, here ? "here" : "")] : [];
      const button = el("button", { type: "button", class: "plain", "aria-current": here ? "step" : null, onclick: () => openStep(state, { index: i }) },
        did || "start", el("small", {}, from === null || from === undefined || from === i - 1 ? "" : ` from ${from + 1}`));
      peek(button, smiles, [el("span", {}, smiles)]);
      return lane(button, axis, things, known ? [el("b", {}, number(row.pka)), moved === null ? "" : ` (${signed(moved)})`] : "none", { tag: "li", class: here ? "here" : "" });
    })));
}

// From the parent to the acid, one substituent after the other, along the same axis.
function walk(view, axis) {
  const step = view.steps[view.shown_step - 1];
  if (step.parent_pka === null) {
    return el("section", { class: "walk", "aria-label": "How the value comes about" }, el("h2", {}, "How it comes about"),
      el("p", {}, "This acid has too many substituents to say in a short time what each of them does."));
  }
  let now = step.parent_pka;
  const parent = el("span", {}, "parent ", el("small", { class: "smiles" }, step.parent));
  peek(parent, step.parent, [el("span", {}, step.parent)]);
  const lanes = [lane(parent, axis, [dot(axis, now, "open")], number(now), { tag: "li" })];
  for (const line of step.contributions) {
    const before = now;
    now += line.contribution;
    const kind = line.contribution < 0 ? "lowers" : "raises";
    const pairs = line.pairs ? `${line.pairs} measured pair${line.pairs === 1 ? "" : "s"}, mean ${signed(line.pairs_mean)}` : "no measured pair";
    lanes.push(lane(
      el("span", {}, line.substituent, el("small", {}, pairs)), axis,
      [el("span", { class: `move ${kind}`, left: axis.at(Math.min(before, now)), width: axis.span(Math.min(before, now), Math.max(before, now)), "aria-hidden": "true" }),
        dot(axis, now, "small")],
      [el("b", {}, signed(line.contribution)), el("small", {}, `${signed(line.low)} to ${signed(line.high)}`)], { tag: "li" }));
  }
  lanes.push(lane(el("b", {}, "this acid"), axis, [bar(axis, step.low, step.high), dot(axis, step.pka, "here")], el("b", {}, number(step.pka)), { tag: "li", class: "here" }));
  return el("section", { class: "walk", "aria-label": "How the value comes about" },
    el("h2", {}, view.steps.length > 1 ? `How step ${step.step} comes about` : "How it comes about"),
    el("p", { class: "key" }, el("span", { class: "swatch lowers" }), "lowers the pKa ", el("span", { class: "swatch raises" }), "raises it"),
    step.contributions.length ? null : el("p", {}, "This acid has no substituent: it is its own parent."),
    el("ol", { class: "lanes" }, lanes));
}

function next({ view, coverage }) {
  const structures = [{ id: view.name || "1", smiles: view.smiles }];
  return el("section", { class: "next", "aria-label": "Go on" }, el("h2", {}, "Go on"),
    el("p", { class: "links" },
      el("a", { href: `#/decide?s=${encodeURIComponent(view.smiles)}` }, "Decide with this pKa: base, window, buffer, risk"),
      exports(async () => (await askJson("predict", { structures, coverage })).rows, () => structures, coverage)));
}

export function exports(rows, structures, coverage, decisions = null) {
  const status = el("span", { class: "saved", role: "status" });
  const take = async (kind) => {
    status.textContent = "Writing …";
    try {
      const answer = kind === "html"
        ? await ask("report", { structures: structures(), coverage, decisions: decisions ? decisions() : [] })
        : await ask("export", { format: kind, rows: await rows() });
      save(await answer.blob(), `acids.${kind}`);
      status.textContent = `acids.${kind} is saved.`;
    } catch (problem) {
      if (!problem.message) throw problem;
      status.textContent = problem.message;
    }
  };
  return el("span", { class: "exports", role: "group", "aria-label": "Download" }, "Download ",
    [["csv", "CSV"], ["xlsx", "XLSX"], ["sdf", "SDF"], ["html", "report"]].map(([kind, name]) =>
      el("button", { type: "button", class: "small", onclick: () => take(kind) }, name)), status);
}

export function tintedDrawing(view) {
  const drawing = view.drawing;
  return el("img", {
    src: `data:image/svg+xml;charset=utf-8,${encodeURIComponent(dark() ? drawing.dark : drawing.light)}`,
    alt: `Structure of ${title(view)}: ${view.smiles}`, class: "picture",
  });
}

export function emptyAcid(main, parents) {
  ruler = null;
  document.title = "acidity: pKa of carboxylic acids";
  say("");
  const axis = new Axis([0, 6]);
  main.replaceChildren(
    el("section", { class: "welcome", "aria-label": "Start" },
      el("h1", {}, "How acidic is it?"),
      el("p", {}, "Type, paste or drop carboxylic acids above, or start from a parent and change it group by group."),
      el("h2", {}, "Parents"),
      el("ul", { class: "gallery" }, parents.map(({ name, smiles }) => el("li", {},
        el("a", { href: `#/acid?s=${encodeURIComponent(smiles)}` }, picture(smiles, 150, 96), el("span", {}, name)))))));
  return axis;
}
