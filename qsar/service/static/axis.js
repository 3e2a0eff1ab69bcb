// The pKa axis that everything on the page shares, and what lies along it.

import { el, number, picture, svg } from "./util.js";

export class Axis {
  constructor(values) {
    const known = values.filter((value) => Number.isFinite(value));
    let low = known.length ? Math.floor(Math.min(...known) - 0.25) : 0;
    let high = known.length ? Math.ceil(Math.max(...known) + 0.25) : 7;
    while (high - low < 3) {
      if ((high - low) % 2) low -= 1;
      else high += 1;
    }
    this.low = low;
    this.high = high;
  }

  share(value) {
    return (100 * (value - this.low)) / (this.high - this.low);
  }

  at(value) {
    return `${Math.min(Math.max(this.share(value), 0), 100)}%`;
  }

  span(low, high) {
    return `${Math.max(Math.min(this.share(high), 100) - Math.max(this.share(low), 0), 0)}%`;
  }
}

// The engraved scale: a long line for each unit, shorter ones between.
export function scale(axis) {
  const range = axis.high - axis.low;
  const minor = range <= 5 ? 10 : range <= 10 ? 5 : 2;
  const every = range <= 12 ? 1 : 2;
  const drawing = svg("svg", { class: "scale", "aria-hidden": "true" });
  for (let k = axis.low * minor; k <= axis.high * minor; k += 1) {
    const x = axis.at(k / minor);
    const kind = k % minor === 0 ? 22 : (2 * k) % minor === 0 ? 15 : 9;
    drawing.append(svg("line", { x1: x, x2: x, y1: 0, y2: kind }));
    if (k % minor === 0 && (k / minor) % every === 0) {
      const end = k / minor === axis.low ? "start" : k / minor === axis.high ? "end" : "middle";
      drawing.append(svg("text", { x, y: 38, "text-anchor": end }, number(k / minor, 0)));
    }
  }
  return drawing;
}

// Light lines behind a lane, so that the eye finds the units.
export function lines(axis) {
  const drawing = svg("svg", { class: "units", "aria-hidden": "true" });
  for (let k = axis.low; k <= axis.high; k += 1) {
    drawing.append(svg("line", { x1: axis.at(k), x2: axis.at(k), y1: 0, y2: "100%" }));
  }
  return drawing;
}

export function lane(label, axis, things, tail, attributes = {}) {
  return el(attributes.tag || "div", { ...attributes, tag: null, class: `lane ${attributes.class || ""}` },
    el("div", { class: "lanelabel" }, label),
    el("div", { class: "track" }, lines(axis), things),
    el("div", { class: "tail" }, tail));
}

export const bar = (axis, low, high, kind = "") =>
  el("span", { class: `bar ${kind}`, left: axis.at(low), width: axis.span(low, high), "aria-hidden": "true" });
export const dot = (axis, value, kind = "") =>
  el("span", { class: `dot ${kind}`, left: axis.at(value), "aria-hidden": "true" });

export const VERDICTS = {
  inside: "inside the domain",
  borderline: "borderline",
  outside: "outside the domain",
  unusable: "not usable",
};

export const verdict = (domain, text = VERDICTS[domain]) =>
  el("span", { class: `verdict ${domain}` }, el("span", { class: "sign", "aria-hidden": "true" }), text);

// A card that shows a measured acid while its tick is pointed at or has the focus.
export function peek(target, smiles, content) {
  const card = document.getElementById("peek");
  const show = () => {
    card.replaceChildren(...(smiles ? [picture(smiles, 200, 130)] : []), ...content);
    card.hidden = false;
    target.setAttribute("aria-describedby", "peek");
    const box = target.getBoundingClientRect();
    const width = Math.min(260, window.innerWidth - 16);
    card.style.width = `${width}px`;
    card.style.left = `${Math.min(Math.max(8, box.left + box.width / 2 - width / 2), window.innerWidth - width - 8) + window.scrollX}px`;
    card.style.top = `${box.bottom + 8 + window.scrollY}px`;
  };
  const hide = () => {
    card.hidden = true;
    target.removeAttribute("aria-describedby");
  };
  target.addEventListener("mouseenter", show);
  target.addEventListener("focus", show);
  target.addEventListener("mouseleave", hide);
  target.addEventListener("blur", hide);
  target.addEventListener("keydown", (event) => {
    if (event.key === "Escape") hide();
  });
}

export function hidePeek() {
  document.getElementById("peek").hidden = true;
}

// The ruler proper. It stays in the page while acids change, so that its cursors can slide.
export class Ruler {
  constructor(onStep) {
    this.onStep = onStep;
    this.cursors = new Map();
    this.flags = el("div", { class: "flags" });
    this.glass = el("div", { class: "glass" });
    this.ivory = el("div", { class: "ivory" });
    this.ticks = el("div", { class: "ticks" });
    this.node = el("div", { class: "ruler", role: "group" }, this.flags,
      el("div", { class: "band" }, el("span", { class: "ends", "aria-hidden": "true" }, "pKa"), this.ivory, this.glass), this.ticks);
  }

  show(view, axis, onOpen) {
    const steps = view.steps;
    this.node.setAttribute("aria-label", `pKa ruler from ${number(axis.low, 0)} to ${number(axis.high, 0)}`);
    this.ivory.replaceChildren(scale(axis));
    const several = steps.length > 1;
    this.node.style.setProperty("--flags", String(flagRows(steps, axis)));
    for (const [key, cursor] of this.cursors) {
      if (key > steps.length) {
        cursor.flag.remove();
        cursor.glass.remove();
        this.cursors.delete(key);
      }
    }
    steps.forEach((step, index) => this.cursor(step, axis, several, view.shown_step, index % flagRows(steps, axis)));
    this.evidence(steps[view.shown_step - 1], axis, onOpen);
  }

  cursor(step, axis, several, shown, row) {
    let cursor = this.cursors.get(step.step);
    if (!cursor) {
      cursor = {
        flag: el("button", { type: "button", class: "flag", onclick: () => this.onStep(step.step) }),
        glass: el("span", { class: "cursor" }, el("i"), el("b")),
      };
      this.cursors.set(step.step, cursor);
      this.flags.append(cursor.flag);
      this.glass.append(cursor.glass);
    }
    const { flag, glass } = cursor;
    flag.replaceChildren(el("small", {}, several ? `step ${step.step}` : "pKa"), ` ${number(step.pka)}`,
      el("span", { class: "hidden" }, `, interval ${number(step.low)} to ${number(step.high)}`));
    flag.setAttribute("aria-pressed", String(step.step === shown));
    flag.style.left = axis.at(step.pka);
    flag.style.setProperty("--row", String(row));
    flag.classList.toggle("first", axis.share(step.pka) < 8);
    flag.classList.toggle("last", axis.share(step.pka) > 92);
    glass.classList.toggle("shown", step.step === shown);
    const [span, hair] = glass.children;
    span.style.left = axis.at(step.low);
    span.style.width = axis.span(step.low, step.high);
    hair.style.left = axis.at(step.pka);
  }

  evidence(step, axis, onOpen) {
    const ticks = [];
    if (step.measured !== null) {
      ticks.push({ pka: step.measured, own: true, name: "this acid, measured", source: step.measured_source });
    }
    for (const near of step.neighbours) {
      if (near.distance > 1e-6 || step.measured === null) ticks.push(near);
    }
    const rows = [];
    this.ticks.replaceChildren(...ticks.map((tick, index) => {
      const x = axis.share(tick.pka);
      let row = rows.findIndex((last) => Math.abs(last.at(-1) - x) > 9 && last.every((other) => Math.abs(other - x) > 9));
      if (row < 0) row = rows.push([]) - 1;
      rows[row].push(x);
      const said = tick.own ? tick.name : tick.name || tick.smiles || "structure withheld";
      const button = el("button", {
        type: "button", class: tick.own ? "tick own" : "tick", left: axis.at(tick.pka),
        "aria-label": `${said}, measured ${number(tick.pka)}${tick.own ? "" : `, nearest acid ${index + (step.measured === null ? 1 : 0)}`}`,
        onclick: () => !tick.own && tick.smiles && onOpen(tick.smiles),
      }, el("span", {}, number(tick.pka)));
      button.style.setProperty("--row", String(row));
      button.style.zIndex = String(20 - row); // stems pass behind the labels above them
      peek(button, tick.own ? "" : tick.smiles, [
        el("strong", {}, said), el("span", {}, `measured ${number(tick.pka)}${tick.own ? "" : `, ${number(tick.distance)} away`}`),
        el("small", {}, tick.source)]);
      return button;
    }));
    this.ticks.style.setProperty("--rows", String(Math.max(rows.length, 1)));
  }
}

// Flags that would cover each other get rows of their own.
function flagRows(steps, axis) {
  let closest = 100;
  for (let k = 1; k < steps.length; k += 1) {
    closest = Math.min(closest, axis.share(steps[k].pka) - axis.share(steps[k - 1].pka));
  }
  return closest < (window.innerWidth < 700 ? 34 : 12) ? Math.min(steps.length, 3) : 1;
}
