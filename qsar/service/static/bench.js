// The drawing whose places can be chosen, and the groups that can be put there.

import { Axis, bar, dot, lane, scale, verdict } from "./axis.js";
import { openStep, tintedDrawing } from "./acid.js";
import { askJson, el, failed, number, say, signed } from "./util.js";

let groups = null;
let chosen = null; // key of the place, kept while the acid stays

export function bench(state) {
  const { view } = state;
  if (chosen?.smiles !== view.smiles) {
    const same = chosen && view.positions.find((p) => p.label.split(":")[0] === chosen.place && !p.hydrogen === !chosen.hydrogen);
    chosen = same ? { smiles: view.smiles, key: same.key, place: chosen.place, hydrogen: chosen.hydrogen } : { smiles: view.smiles, key: null };
  }
  const panel = el("div", { class: "panel" });
  const handles = el("div", { class: view.positions.length > 40 ? "handles crowded" : "handles", role: "group", "aria-label": "Places on the drawing" });
  const list = el("select", { id: "place", onchange: () => choose(list.value) },
    el("option", { value: "" }, "choose …"),
    view.positions.map((p) => el("option", { value: p.key }, p.label)));
  const buttons = view.positions.map((p) => el("button", {
    type: "button", class: p.hydrogen ? "handle hydrogen" : "handle", left: `${100 * p.x}%`, top: `${100 * p.y}%`,
    "aria-label": `${p.place || "group"}: exchange ${p.hydrogen ? "a hydrogen" : p.group}`, title: p.label, "data-key": p.key,
    onclick: () => choose(p.key),
  }, p.hydrogen ? "H" : ""));
  handles.append(...buttons);
  // Arrow keys go from place to place; only one of them is in the order of the tab key.
  handles.addEventListener("keydown", (event) => {
    const move = { ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1 }[event.key];
    if (!move) return;
    event.preventDefault();
    const now = buttons.indexOf(document.activeElement);
    buttons[(now + move + buttons.length) % buttons.length].focus();
  });

  function choose(key) {
    const place = view.positions.find((p) => p.key === key);
    chosen = { smiles: view.smiles, key: key || null, place: place?.label.split(":")[0], hydrogen: place?.hydrogen };
    list.value = key;
    buttons.forEach((button, i) => {
      button.setAttribute("aria-pressed", String(button.dataset.key === key));
      button.tabIndex = button.dataset.key === key || (!key && i === 0) ? 0 : -1;
    });
    if (place) fill(panel, state, place);
    else panel.replaceChildren(el("p", { class: "hint" }, "Choose a place on the drawing or in the list: a dot is a group, an H a hydrogen."));
  }

  choose(chosen.key || "");
  return el("section", { class: "bench", "aria-label": "Swap a substituent" },
    el("div", { class: "board" }, tintedDrawing(view), handles),
    el("div", { class: "swap" }, el("h2", {}, "Swap a substituent"),
      el("p", { class: "field" }, el("label", { for: "place" }, "Place"), list), panel),
    el("div", { class: "all" }));
}

async function fill(panel, state, place) {
  try {
    groups ||= await askJson("groups");
  } catch (problem) {
    failed(panel, problem, () => fill(panel, state, place));
    return;
  }
  const search = el("input", { type: "search", id: "search", autocomplete: "off", placeholder: "nitro, CF3, *C#N" });
  const list = el("ul", { class: "groups", "aria-label": "Groups" });
  const show = () => {
    const wanted = search.value.trim().toLowerCase();
    const hits = groups.filter((g) => !wanted || g.name.toLowerCase().includes(wanted) || g.words.includes(wanted) || g.smiles.toLowerCase() === wanted);
    hits.sort((a, b) => rank(a, wanted) - rank(b, wanted));
    const own = /\*/.test(search.value) ? [{ name: search.value.trim(), smiles: search.value.trim(), words: "your own" }] : [];
    list.replaceChildren(...[...own, ...hits].map((g) => el("li", {},
      el("button", { type: "button", class: "group", title: g.words, onclick: () => take(state, place, g, panel) }, g.name))));
    if (!list.children.length) list.replaceChildren(el("li", {}, "No group of that name; a SMILES with * works too."));
  };
  search.addEventListener("input", show);
  const low = el("input", { type: "number", step: "0.1", id: "low", size: 5 });
  const high = el("input", { type: "number", step: "0.1", id: "high", size: 5 });
  const all = panel.closest(".bench")?.querySelector(".all") || el("div");
  all.replaceChildren();
  panel.replaceChildren(
    el("p", { class: "field" }, el("label", { for: "search" }, `Instead of ${place.hydrogen ? "H" : place.group}`), search), list,
    el("form", { class: "try", onsubmit: (event) => { event.preventDefault(); tryAll(state, place, low, high, all); } },
      el("button", { type: "submit" }, "Try all here"),
      el("span", {}, el("label", { for: "low" }, "pKa from"), low, el("label", { for: "high" }, "to"), high)));
  show();
}

function rank(group, wanted) {
  if (!wanted) return 0;
  if (group.name.toLowerCase() === wanted || group.words === wanted) return 0;
  return group.name.toLowerCase().startsWith(wanted) || group.words.startsWith(wanted) ? 1 : 2;
}

async function take(state, place, group, panel) {
  say(`Putting ${group.name} there …`, true);
  try {
    const view = await askJson("swap", {
      smiles: state.view.smiles, position: place.key, group: group.smiles, coverage: state.coverage, step: state.step,
    });
    await openStep(state, {
      trail: [...state.trail, [view.smiles, `${place.place ? `${place.place}: ` : ""}${place.group} → ${group.name}`, state.index]],
      index: state.trail.length,
    });
  } catch (problem) {
    failed(panel, problem, () => fill(panel, state, place));
  }
}

async function tryAll(state, place, low, high, target) {
  target.replaceChildren(el("p", { class: "loading" }, "Trying every group …"));
  try {
    const value = (input) => (input.value === "" ? null : Number(input.value));
    const answer = await askJson("analogues", {
      smiles: state.view.smiles, position: place.key, step: state.view.shown_step, low: value(low), high: value(high), coverage: state.coverage,
    });
    const usable = answer.rows.filter((row) => row.pka !== null);
    const axis = new Axis(usable.flatMap((row) => [row.low, row.high]));
    const count = `${usable.length} group${usable.length === 1 ? "" : "s"} at ${answer.place || "this place"}, by rising pKa`;
    say(count);
    const from = value(low) ?? axis.low;
    const to = value(high) ?? axis.high;
    const wanted = value(low) === null && value(high) === null ? [] : [el("span", { class: "holds", left: axis.at(from), width: axis.span(from, to) })];
    target.replaceChildren(el("h3", {}, count), ...(usable.length ? [] : [el("p", {}, "No group of the list meets this range; widen it, or choose another place.")]),
      el("div", { class: "lane" }, el("div", { class: "lanelabel" }, "pKa"), el("div", { class: "track ivory" }, scale(axis)), el("div", { class: "tail" }, "change, verdict")),
      el("ol", { class: "lanes", tabindex: "0", "aria-label": count }, usable.map((row) => lane(
        el("button", { type: "button", class: "plain", onclick: () => take(state, place, { name: row.group, smiles: groups.find((g) => g.name === row.group).smiles }, target) }, row.group),
        axis, [wanted.map((node) => node.cloneNode()), bar(axis, row.low, row.high, row.domain), dot(axis, row.pka, row.domain)],
        [el("b", {}, number(row.pka)), ` (${signed(row.change)}) `, el("small", {}, verdict(row.domain, row.domain))], { tag: "li" }))));
  } catch (problem) {
    failed(target, problem, () => tryAll(state, place, low, high, target));
  }
}
