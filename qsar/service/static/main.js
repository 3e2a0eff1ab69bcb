// The entry: what is typed, pasted or dropped, and which part of the page a link opens.

import { emptyAcid, showAcid } from "./acid.js";
import { hidePeek } from "./axis.js";
import { showDecide } from "./decide.js";
import { emptyMany, openFile, openList, showMany, stopMany } from "./many.js";
import { Problem, askJson, el, failed, go, say } from "./util.js";

const main = document.getElementById("main");
const form = document.getElementById("ask");
const text = document.getElementById("text");
const file = document.getElementById("file");
const hint = document.getElementById("names");
let about = null;

async function route() {
  const [path, search] = location.hash.replace(/^#\/?/, "").split("?");
  const query = new URLSearchParams(search);
  hidePeek();
  if (path !== "many") stopMany();
  for (const link of document.querySelectorAll("nav a")) {
    const here = link.dataset.part === (path || "acid");
    if (here) link.setAttribute("aria-current", "page");
    else link.removeAttribute("aria-current");
  }
  form.hidden = path === "decide";
  try {
    if (path === "acid" && (query.get("s") || query.get("t"))) await showAcid(main, query);
    else if (path === "many") await (query.get("z") ? showMany(main, query) : emptyMany(main));
    else if (path === "decide") await showDecide(main, query);
    else {
      main.replaceChildren(el("p", { class: "loading" }, "Starting …"));
      const parents = await askJson("parents");
      if (path === (location.hash.replace(/^#\/?/, "").split("?")[0])) emptyAcid(main, parents);
    }
  } catch (problem) {
    failed(main, problem, route);
  }
}

async function submit() {
  const given = text.value.trim();
  if (!given) {
    say("Type or paste an acid first.", true);
    text.focus();
    return;
  }
  say("Reading …", true);
  try {
    const { structures } = await askJson("read", { text: text.value });
    if (structures.length === 1 && !structures[0].error) go("acid", { s: structures[0].smiles });
    else if (structures.length === 1) throw new Problem(structures[0].error);
    else await openList(structures);
  } catch (problem) {
    failed(main, problem, null);
    text.focus();
  }
}

form.addEventListener("submit", (event) => {
  event.preventDefault();
  submit();
});
text.addEventListener("keydown", (event) => {
  if (event.key === "Enter" && !event.shiftKey && !text.value.includes("\n")) {
    event.preventDefault();
    submit();
  }
});

// Names of measured acids that begin like, or hold, what is typed.
text.addEventListener("input", async () => {
  text.rows = Math.min(Math.max(text.value.split("\n").length, 1), 8);
  const wanted = text.value.trim().toLowerCase();
  hint.hidden = true;
  if (wanted.length < 3 || /[=\n()]/.test(wanted)) return;
  try {
    about ||= await askJson("about");
  } catch (problem) {
    if (problem instanceof Problem) return; // the answer to the question itself will say it
    throw problem;
  }
  if (wanted !== text.value.trim().toLowerCase()) return;
  const hits = about.names.filter((name) => name.toLowerCase().includes(wanted))
    .sort((a, b) => a.toLowerCase().indexOf(wanted) - b.toLowerCase().indexOf(wanted) || a.length - b.length).slice(0, 8);
  hint.hidden = !hits.length;
  hint.replaceChildren("In the table: ", ...hits.map((name) => el("button", {
    type: "button", class: "small", onclick: () => { text.value = name; hint.hidden = true; submit(); },
  }, name)));
});

file.addEventListener("change", () => {
  if (file.files.length) openFile(main, file.files[0]);
  file.value = "";
});
for (const kind of ["dragover", "drop"]) {
  document.addEventListener(kind, (event) => {
    if (!event.dataTransfer?.types.includes("Files")) return;
    event.preventDefault();
    document.body.classList.toggle("dropping", kind === "dragover");
    if (kind === "drop" && event.dataTransfer.files.length) openFile(main, event.dataTransfer.files[0]);
  });
}
document.addEventListener("dragleave", () => document.body.classList.remove("dropping"));
document.querySelector("[data-skip]").addEventListener("click", (event) => {
  event.preventDefault();
  main.focus();
});
window.addEventListener("hashchange", route);
window.matchMedia("(prefers-color-scheme: dark)").addEventListener("change", route);
route();
