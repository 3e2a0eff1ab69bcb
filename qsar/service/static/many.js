// Many acids: a stream of rows into a table that sorts, filters, selects and downloads.

import { Axis, VERDICTS, bar, dot, scale, verdict } from "./axis.js";
import { exports } from "./acid.js";
import { Problem, ask, el, failed, go, number, pack, picture, say, unpack } from "./util.js";

const PAGE = 50;
let running = null;
let table = null; // the list that is shown: { z, rows, total, coverage, ... }

export function stopMany() {
  running?.abort();
  running = null;
}
window.addEventListener("pagehide", stopMany);

export const openList = async (structures) => go("many", { z: await pack(structures.map((s) => [s.id, s.smiles])) });

export function emptyMany(main) {
  stopMany();
  document.title = "acidity: many acids";
  say("");
  main.replaceChildren(el("section", { class: "welcome", "aria-label": "Many acids" }, el("h1", {}, "Many acids"),
    el("p", {}, "Paste one SMILES a line above, with a name behind it if you like, or drop a CSV, XLSX, SMI or SDF file anywhere on this page. A table needs a column smiles; a column id is kept."),
    el("p", {}, "Rows appear while the rest is computed. Nothing is sent anywhere else.")));
}

export async function showMany(main, query) {
  const z = query.get("z");
  if (table?.z === z && table.complete) {
    render(main);
    return;
  }
  const structures = await unpack(z);
  const coverage = Number(query.get("c")) || 0.9;
  await receive(main, { z, total: structures.length, coverage }, (signal) =>
    ask("stream", { coverage, structures: structures.map(([id, smiles]) => ({ id: String(id).slice(0, 400), smiles })) }, { signal }));
}

export async function openFile(main, file) {
  stopMany();
  if (location.hash !== "#/many") history.pushState(null, "", "#/many");
  for (const link of document.querySelectorAll("nav a")) {
    if (link.dataset.part === "many") link.setAttribute("aria-current", "page");
    else link.removeAttribute("aria-current");
  }
  document.getElementById("ask").hidden = false;
  const body = new FormData();
  body.append("file", file);
  main.replaceChildren(el("p", { class: "loading" }, `Reading ${file.name} …`));
  say(`Reading ${file.name}`);
  await receive(main, { z: null, total: null, coverage: 0.9, name: file.name }, (signal) => ask("file", body, { signal }));
}

async function receive(main, start, request) {
  stopMany();
  const control = (running = new AbortController());
  const own = (table = { ...start, rows: [], inputs: 0, complete: false, stopped: "", sort: "order", down: false, page: 0, selected: new Set(), filter: { verdicts: new Set(Object.keys(VERDICTS)) } });
  document.title = "acidity: many acids";
  let drawn = 0;
  const draw = (force) => {
    if (table !== own) return;
    if (force || performance.now() - drawn > 400) {
      render(main);
      drawn = performance.now();
    }
    progress(main);
  };
  try {
    const answer = await request(control.signal);
    for await (const event of events(answer)) {
      if (event.event === "start") own.total = event.total;
      if (event.event === "rows") {
        for (const row of event.rows) own.rows.push({ ...row, order: own.rows.length });
        own.inputs = event.done;
      }
      if (event.event === "end") own.complete = true;
      if (event.event === "failed") own.stopped = event.detail;
      if (event.event !== "start") draw(event.event !== "rows");
    }
    if (!own.complete && !own.stopped) own.stopped = "The answer broke off.";
    if (own.complete && own.z === null) await linkOf(own);
  } catch (problem) {
    if (problem.name === "AbortError") {
      own.stopped = "Cancelled.";
      if (table === own && location.hash.startsWith("#/many") && own.total !== null) draw(true);
      return;
    }
    if (!own.rows.length) {
      failed(main, problem, null);
      return;
    }
    if (!(problem instanceof Problem) && problem.name !== "TypeError") throw problem;
    own.stopped = "The connection broke off.";
  } finally {
    if (running === control) running = null;
  }
  draw(true);
}

// The list itself goes into the link, so that it reopens without a file.
async function linkOf(own) {
  const seen = own.rows.filter((row) => row.step === null || row.step === 1).map((row) => [row.id, row.smiles]);
  const z = await pack(seen);
  if (z.length > 1500000 || table !== own || location.hash !== "#/many") return;
  own.z = z;
  history.replaceState(null, "", `#/many?z=${z}`);
}

async function* events(answer) {
  const reader = answer.body.pipeThrough(new TextDecoderStream()).getReader();
  let rest = "";
  for (;;) {
    const { value, done } = await reader.read();
    if (done) return;
    const lines = (rest + value).split("\n");
    rest = lines.pop();
    for (const line of lines) yield JSON.parse(line);
  }
}

function shownRows() {
  const { filter, sort, down } = table;
  const text = (filter.text || "").toLowerCase();
  const rows = table.rows.filter((row) =>
    filter.verdicts.has(row.domain)
    && (filter.low === undefined || (row.pka !== null && row.pka >= filter.low))
    && (filter.high === undefined || (row.pka !== null && row.pka <= filter.high))
    && (filter.width === undefined || (row.pka !== null && row.high - row.low <= filter.width))
    && (!text || row.id.toLowerCase().includes(text) || row.smiles.toLowerCase().includes(text)));
  const value = {
    order: (row) => row.order, id: (row) => row.id.toLowerCase(), pka: (row) => row.pka, width: (row) => (row.pka === null ? null : row.high - row.low),
    verdict: (row) => Object.keys(VERDICTS).indexOf(row.domain), measured: (row) => row.measured,
  }[sort];
  rows.sort((a, b) => compare(value(a), value(b), down) || a.order - b.order);
  return rows;
}

function compare(a, b, down) {
  if (a === null || b === null) return (a === null) - (b === null);
  return (a < b ? -1 : a > b ? 1 : 0) * (down ? -1 : 1);
}

function progress(main) {
  const place = main.querySelector("#progress");
  if (!place) return;
  const { inputs, total, complete, stopped } = table;
  if (complete) {
    place.replaceChildren(el("p", {}, `${inputs.toLocaleString("en")} structures, ${table.rows.length.toLocaleString("en")} rows.`));
    say(`Done: ${inputs} structures.`);
  } else if (stopped) {
    const kept = inputs ? ` The answers to the first ${inputs.toLocaleString("en")} of ${(total ?? 0).toLocaleString("en")} structures are below.` : "";
    place.replaceChildren(el("p", { class: "partial", role: "alert" }, `${stopped}${kept}`));
    say("");
  } else {
    const meter = place.querySelector("progress") || el("progress", { "aria-label": "Structures done" });
    meter.max = total || 1;
    meter.value = inputs;
    if (!meter.parentNode) {
      place.replaceChildren(meter, el("span", {}), el("button", { type: "button", class: "small", onclick: stopMany }, "Cancel"));
      say("Working …");
    }
    place.querySelector("span").textContent = `${inputs.toLocaleString("en")} of ${(total ?? 0).toLocaleString("en")}`;
  }
}

function render(main) {
  if (!main.querySelector("#table")) {
    main.replaceChildren(el("section", { class: "many", "aria-label": "Many acids" },
      el("h1", {}, table.name ? `Acids of ${table.name}` : "Many acids"),
      el("div", { id: "progress" }), controls(main), el("div", { id: "table" })));
  }
  body(main);
  progress(main);
}

function controls(main) {
  const again = () => {
    table.page = 0;
    body(main);
  };
  const field = (key, label, type = "number") => {
    const input = el("input", { type, id: `f-${key}`, step: "0.1", size: 6 });
    input.addEventListener("input", () => {
      table.filter[key] = type === "number" ? (input.value === "" ? undefined : Number(input.value)) : input.value;
      again();
    });
    return el("span", { class: "field" }, el("label", { for: `f-${key}` }, label), input);
  };
  const verdicts = Object.entries(VERDICTS).map(([key, name]) => {
    const box = el("input", { type: "checkbox", id: `v-${key}`, checked: true });
    box.addEventListener("change", () => {
      if (box.checked) table.filter.verdicts.add(key);
      else table.filter.verdicts.delete(key);
      again();
    });
    return el("label", { class: "check" }, box, name);
  });
  const chosen = () => {
    const rows = shownRows();
    const selected = rows.filter((row) => table.selected.has(row.order));
    return selected.length ? selected : rows;
  };
  const plain = () => chosen().map(({ order, ...row }) => row);
  const structures = () => {
    const seen = new Set();
    return chosen().filter((row) => !seen.has(`${row.id}\n${row.smiles}`) && seen.add(`${row.id}\n${row.smiles}`)).map(({ id, smiles }) => ({ id: id.slice(0, 400), smiles }));
  };
  return el("div", { class: "controls" },
    el("fieldset", {}, el("legend", {}, "Show"), field("text", "name or SMILES", "search"), field("low", "pKa from"), field("high", "to"), field("width", "interval at most"), verdicts),
    el("p", {}, exports(plain, structures, table.coverage), el("small", { id: "chosen" }, " of all rows shown; select some to take only those")));
}

const COLUMNS = [["order", "Nr"], ["id", "Name"], [null, "Structure"], ["pka", "pKa"], ["width", "Interval"], [null, "axis"], ["verdict", "Verdict"], ["measured", "Measured"]];

function body(main) {
  const rows = shownRows();
  const pages = Math.max(Math.ceil(rows.length / PAGE), 1);
  table.page = Math.min(table.page, pages - 1);
  const page = rows.slice(table.page * PAGE, (table.page + 1) * PAGE);
  const axis = new Axis(page.flatMap((row) => [row.low, row.high, row.measured].filter((value) => value !== null)));
  const all = el("input", { type: "checkbox", "aria-label": "Select all rows shown" });
  all.checked = rows.length > 0 && rows.every((row) => table.selected.has(row.order));
  all.addEventListener("change", () => {
    for (const row of rows) all.checked ? table.selected.add(row.order) : table.selected.delete(row.order);
    body(main);
  });
  const heads = COLUMNS.map(([key, name]) => {
    if (name === "axis") return el("th", { scope: "col", class: "axis" }, el("span", { class: "hidden" }, "On the pKa axis"), scale(axis));
    if (!key) return el("th", { scope: "col" }, name);
    const sorted = table.sort === key;
    return el("th", { scope: "col", "aria-sort": sorted ? (table.down ? "descending" : "ascending") : null },
      el("button", { type: "button", class: "plain", onclick: () => {
        table.down = sorted && !table.down;
        table.sort = key;
        body(main);
      } }, name, el("span", { "aria-hidden": "true" }, sorted ? (table.down ? " ↓" : " ↑") : "")));
  });
  const turn = (by, name) => el("button", { type: "button", class: "small", disabled: table.page + by < 0 || table.page + by >= pages, onclick: () => { table.page += by; body(main); } }, name);
  main.querySelector("#table").replaceChildren(
    el("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": "Table of predictions" },
      el("table", {}, el("thead", {}, el("tr", {}, el("th", { scope: "col" }, all), heads)),
        el("tbody", {}, page.length ? page.map((row) => line(row, axis, main)) : el("tr", {}, el("td", { colspan: 9 }, table.rows.length ? "No row meets these limits; widen them." : "No rows yet."))))),
    el("p", { class: "pages" }, turn(-1, "Back"), ` page ${table.page + 1} of ${pages}, ${rows.length.toLocaleString("en")} rows `, turn(1, "On")));
}

function line(row, axis, main) {
  const box = el("input", { type: "checkbox", "aria-label": `Select ${row.id}` });
  box.checked = table.selected.has(row.order);
  box.addEventListener("change", () => {
    if (box.checked) table.selected.add(row.order);
    else table.selected.delete(row.order);
  });
  const usable = row.pka !== null;
  const name = row.step > 1 ? `${row.id}, step ${row.step}` : row.id;
  return el("tr", { class: usable ? null : "unusable" },
    el("td", {}, box), el("td", { class: "num" }, String(row.order + 1)),
    el("th", { scope: "row" }, usable ? el("a", { href: `#/acid?s=${encodeURIComponent(row.structure)}${row.step > 1 ? `&k=${row.step}` : ""}` }, name) : name),
    el("td", {}, usable ? picture(row.structure, 120, 72, row.structure) : el("span", { class: "smiles" }, row.smiles.slice(0, 60))),
    usable ? el("td", { class: "num" }, el("b", {}, number(row.pka))) : el("td", { colspan: 3 }, row.reasons),
    usable && el("td", { class: "num" }, `${number(row.low)} to ${number(row.high)}`),
    usable && el("td", { class: "axis" }, el("div", { class: "track" }, bar(axis, row.low, row.high, row.domain), dot(axis, row.pka, row.domain), row.measured === null ? null : dot(axis, row.measured, "measured"))),
    el("td", {}, verdict(row.domain), usable && row.domain !== "inside" ? el("details", {}, el("summary", {}, "why"), row.reasons) : null),
    el("td", { class: "num" }, number(row.measured)));
}
