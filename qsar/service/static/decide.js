// What to do with a pKa, decision by decision: base, window, buffer, and whether to measure.

import { Axis, bar, dot, lane, scale } from "./axis.js";
import { exports } from "./acid.js";
import { askJson, el, failed, go, number, percent, say } from "./util.js";

const KINDS = {
  base: ["Base", "Which base pulls it into the water?", [
    ["amount_mmol", "acid, mmol", 10], ["organic_ml", "organic layer, mL", 50], ["water_ml", "water, mL", 50], ["equivalents", "equivalents of base", 2],
    ["target", "fraction wanted", 0.95], ["into", "wanted in", ["water", "organic"]], ["co2", "CO2", ["vented", "kept"]], ["log_p", "log P (empty: estimated)", ""]]],
  window: ["Window", "Which pH parts it from another acid?", [
    ["other_smiles", "the other acid, SMILES", "", "text"], ["organic_ml", "organic layer, mL", 50], ["water_ml", "water, mL", 50], ["target", "fraction wanted of each", 0.95],
    ["log_p", "log P of this one", ""], ["other_log_p", "log P of the other", ""]]],
  buffer: ["Buffer", "What makes a buffer of this pH?", [
    ["ph", "pH wanted", 4.5], ["total_m", "acid and salt, mol/L", 0.1], ["step", "step", 1], ["tolerance", "pH may be off by", 0.1]]],
  risk: ["Risk", "My choice flips at a pKa: measure first?", [
    ["flips_at", "it flips at pKa", 4.5], ["step", "step", 1], ["risk", "accepted risk", 0.05]]],
};

export async function showDecide(main, query) {
  const kind = query.get("kind") in KINDS ? query.get("kind") : "base";
  document.title = `acidity: ${KINDS[kind][0].toLowerCase()}`;
  const answer = el("div", { id: "answer" });
  const form = questions(kind, query);
  main.replaceChildren(el("section", { class: "decide", "aria-label": "Decide" },
    el("h1", {}, "Decide"),
    el("ul", { class: "kinds" }, Object.entries(KINDS).map(([key, [name]]) => el("li", {}, el("a", {
      href: link(key, query), "aria-current": key === kind ? "true" : null,
    }, name)))),
    el("h2", {}, KINDS[kind][1]), form, answer));
  if (query.get("s") && query.get("go")) await answerTo(kind, query, answer);
  else say("");
}

function link(kind, query) {
  const parameters = new URLSearchParams({ kind });
  if (query.get("s")) parameters.set("s", query.get("s"));
  return `#/decide?${parameters}`;
}

function questions(kind, query) {
  const smiles = el("input", { id: "d-s", value: query.get("s") || "", required: true, spellcheck: "false", autocomplete: "off" });
  const fields = KINDS[kind][2].map(([key, label, usual, type]) => {
    const value = query.get(key) ?? (Array.isArray(usual) ? usual[0] : usual);
    const input = Array.isArray(usual)
      ? el("select", { id: `d-${key}`, name: key }, usual.map((option) => el("option", { value: option, selected: option === value }, option === "organic" ? "organic layer" : option)))
      : el("input", { id: `d-${key}`, name: key, type: type || "number", step: "any", value, required: usual !== "" || type === "text", spellcheck: "false" });
    return el("p", { class: "field" }, el("label", { for: `d-${key}` }, label), input);
  });
  return el("form", { class: "question", onsubmit: async (event) => {
    event.preventDefault();
    const given = Object.fromEntries(new FormData(event.target));
    try {
      const { structures } = await askJson("read", { text: smiles.value });
      const first = structures[0];
      if (first.error) throw new Error(first.error);
      const other = given.other_smiles ? (await askJson("read", { text: given.other_smiles })).structures[0].smiles : undefined;
      go("decide", { kind, s: first.smiles, ...given, other_smiles: other, go: 1 });
    } catch (problem) {
      document.getElementById("answer").replaceChildren(el("p", { class: "failed", role: "alert" }, problem.message));
    }
  } }, el("p", { class: "field wide" }, el("label", { for: "d-s" }, "this acid: SMILES or name"), smiles), fields, el("button", { type: "submit", class: "go" }, "Decide"));
}

async function answerTo(kind, query, place) {
  place.replaceChildren(el("p", { class: "loading" }, "Working …"));
  const question = { smiles: query.get("s") };
  for (const [key, , usual, type] of KINDS[kind][2]) {
    const text = query.get(key);
    if (text !== null && text !== "") question[key] = Array.isArray(usual) || type === "text" ? text : Number(text);
  }
  try {
    const names = await nameOf(question.smiles, question.other_smiles);
    Object.assign(question, names);
    const answer = await askJson(`decide/${kind}`, question);
    place.replaceChildren(result(answer, { kind, ...question }));
    say(answer.headline);
  } catch (problem) {
    failed(place, problem, () => answerTo(kind, query, place));
  }
}

async function nameOf(...smiles) {
  const found = await Promise.all(smiles.filter(Boolean).map((text) => askJson(`acid?smiles=${encodeURIComponent(text)}`)));
  return { name: found[0].name, ...(found[1] ? { other_name: found[1].name } : {}) };
}

function result(answer, question) {
  const ends = answer.verdicts.flatMap((v) => [v.pka, ...v.flips_at]);
  const axis = new Axis([...answer.acids.flatMap((a) => a.steps.flatMap((s) => [s.low, s.high])), ...ends.filter((x) => x > -4 && x < 16)]);
  return el("article", { class: "answer" },
    el("p", { class: "headline" }, answer.headline),
    answer.verdicts.map((v) => el("p", { class: "verdictline" }, v.sentence[0].toUpperCase() + v.sentence.slice(1))),
    el("div", { class: "flips" },
      el("div", { class: "lane" }, el("div", { class: "lanelabel" }, "pKa"), el("div", { class: "track ivory" }, scale(axis)), el("div", { class: "tail" })),
      answer.acids.map((acid) => acid.steps.map((step) => {
        const own = answer.verdicts.filter((v) => v.step === step.step);
        const flips = own.flatMap((v) => v.flips_at).filter((x) => axis.low <= x && x <= axis.high);
        return lane(`${acid.name}${acid.steps.length > 1 ? `, step ${step.step}` : ""}`, axis, [
          own.slice(0, 1).flatMap((v) => v.holds).map(([low, high]) => el("span", { class: "holds", left: axis.at(low ?? axis.low), width: axis.span(low ?? axis.low, high ?? axis.high) })),
          bar(axis, step.low, step.high), dot(axis, step.pka, "here"),
          flips.map((x) => el("span", { class: "flip", left: axis.at(x) }, el("span", {}, number(x))))],
        [el("b", {}, number(step.pka)), el("small", {}, ` ${acid.origin}`)]);
      })),
      answer.verdicts.length ? el("p", { class: "key" }, el("span", { class: "swatch holds" }), "where the choice holds ", el("span", { class: "swatch flip" }), "where it flips") : null),
    answer.table ? bases(answer) : null,
    answer.edges ? edges(answer) : null,
    answer.kind === "buffer" ? ruled("pH", [["made", answer.ph, answer.ph_low, answer.ph_high]], answer.useful, answer.wanted_ph) : null,
    el("ul", { class: "reasons" }, answer.lines.map((line) => el("li", {}, line))),
    answer.cautions.length ? el("div", { class: "note caution" }, el("h3", {}, "Caution"), answer.cautions.map((line) => el("p", {}, line))) : null,
    answer.fine_print.length ? el("details", {}, el("summary", {}, "What counts as pKa of water and of carbonic acid"), answer.fine_print.map((line) => el("p", {}, line))) : null,
    el("p", {}, exports(async () => (await askJson("predict", { structures: structuresOf(answer) })).rows, () => structuresOf(answer), 0.9, () => [question])));
}

const structuresOf = (answer) => answer.acids.map((acid) => ({ id: acid.name, smiles: acid.smiles }));

// Fraction in the water for each base, gentlest first, on a scale from 0 to 1.
function bases(answer) {
  const share = new Axis([0, 1]);
  share.low = 0;
  share.high = 1;
  return el("section", { "aria-label": "Bases" }, el("h3", {}, "Share in the water, gentlest base first"),
    el("ol", { class: "lanes" }, answer.table.map((row) => lane(
      el("span", {}, row.chosen ? el("b", {}, row.base) : row.base, el("small", {}, `pH ${number(row.ph, 1)}`)), share,
      [bar(share, row.low, row.high, row.sufficient ? "" : "outside"), dot(share, row.in_water, row.sufficient ? "here" : "outside"),
        el("span", { class: "wanted", left: share.at(answer.wanted) })],
      [el("b", {}, percent(row.in_water)), el("small", {}, row.sufficient ? ` enough (p ${number(row.probability)})` : ` not enough (p ${number(row.probability)})`)],
      { tag: "li", class: row.chosen ? "here" : "" }))));
}

function edges(answer) {
  const rows = answer.edges.map((edge, i) => [`${i ? "below it stays" : "above it goes"}: ${edge.name}`, edge.ph, edge.low, edge.high]);
  return ruled("pH", rows, answer.exists ? [[answer.edges[0].ph, answer.edges[1].ph]] : [], answer.best_ph);
}

function ruled(unit, rows, open, mark) {
  const axis = new Axis([...rows.flatMap((row) => row.slice(1)), mark]);
  return el("div", { class: "flips" },
    el("div", { class: "lane" }, el("div", { class: "lanelabel" }, unit), el("div", { class: "track ivory" }, scale(axis)), el("div", { class: "tail" })),
    rows.map(([name, value, low, high]) => lane(name, axis, [
      open.map(([a, b]) => el("span", { class: "holds", left: axis.at(a), width: axis.span(a, b) })),
      bar(axis, low, high), dot(axis, value, "here"), el("span", { class: "wanted", left: axis.at(mark) })], el("b", {}, number(value)))));
}
