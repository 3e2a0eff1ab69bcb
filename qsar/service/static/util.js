// Small helpers: elements, numbers, requests, packing of lists into links, files.

export function el(tag, attributes = {}, ...children) {
  const node = document.createElement(tag);
  for (const [key, value] of Object.entries(attributes)) {
    if (value === null || value === undefined || value === false) continue;
    if (key.startsWith("on")) node.addEventListener(key.slice(2), value);
    else if (key === "left" || key === "width" || key === "top" || key === "height") node.style[key] = value;
    else node.setAttribute(key, value === true ? "" : value);
  }
  node.append(...children.flat(Infinity).filter((child) => child !== null && child !== undefined && child !== false));
  return node;
}

export function svg(tag, attributes = {}, ...children) {
  const node = document.createElementNS("http://www.w3.org/2000/svg", tag);
  for (const [key, value] of Object.entries(attributes)) node.setAttribute(key, value);
  node.append(...children);
  return node;
}

export const number = (value, digits = 2) =>
  value === null || value === undefined ? "" : value.toFixed(digits).replace("-", "−");
export const signed = (value) => {
  if (value === null || value === undefined) return "";
  const text = Math.abs(value).toFixed(2);
  return Number(text) === 0 ? text : (value < 0 ? "−" : "+") + text;
};
export const percent = (fraction) => `${Number((100 * fraction).toFixed(1))} %`;

export const dark = () => window.matchMedia("(prefers-color-scheme: dark)").matches;

export class Problem extends Error {}

export async function ask(path, body, options = {}) {
  const request = body === undefined ? {} : {
    method: "POST",
    headers: body instanceof FormData ? {} : { "content-type": "application/json" },
    body: body instanceof FormData ? body : JSON.stringify(body),
  };
  let answer;
  try {
    answer = await fetch(`/api/v1/${path}`, { ...request, ...options });
  } catch (problem) {
    if (problem.name === "AbortError") throw problem;
    throw new Problem("The program does not answer. Is acidity serve still running?");
  }
  if (!answer.ok) throw new Problem(await sentence(answer));
  return answer;
}

async function sentence(answer) {
  try {
    return (await answer.json()).detail;
  } catch {
    return `The program answered with status ${answer.status}.`;
  }
}

export const askJson = async (path, body, options) => (await ask(path, body, options)).json();

export function save(blob, name) {
  const link = el("a", { href: URL.createObjectURL(blob), download: name });
  document.body.append(link);
  link.click();
  link.remove();
  setTimeout(() => URL.revokeObjectURL(link.href), 60000);
}

// A list becomes part of a link: JSON, deflated, in the letters that links allow.
export async function pack(value) {
  const stream = new Blob([JSON.stringify(value)]).stream().pipeThrough(new CompressionStream("deflate-raw"));
  const bytes = new Uint8Array(await new Response(stream).arrayBuffer());
  let text = "";
  for (let i = 0; i < bytes.length; i += 32768) text += String.fromCharCode(...bytes.subarray(i, i + 32768));
  return btoa(text).replaceAll("+", "-").replaceAll("/", "_").replace(/=+$/, "");
}

export async function unpack(text) {
  try {
    const bytes = Uint8Array.from(atob(text.replaceAll("-", "+").replaceAll("_", "/")), (c) => c.charCodeAt(0));
    const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate-raw"));
    return await new Response(stream).json();
  } catch {
    throw new Problem("This link is damaged or cut off; the list in it cannot be read.");
  }
}

export const picture = (smiles, width, height, alt = "") =>
  el("img", {
    src: `/api/v1/drawing?smiles=${encodeURIComponent(smiles)}&width=${width}&height=${height}${dark() ? "&dark=true" : ""}`,
    width: null, alt, loading: "lazy", class: "picture",
  });

// For screen readers always; shown as well where nothing else on the page says it.
export function say(text, shown = false) {
  const status = document.getElementById("status");
  status.textContent = text;
  status.classList.toggle("hidden", !shown);
}

export function failed(place, problem, again) {
  if (problem.name === "AbortError") return;
  if (!(problem instanceof Problem)) throw problem;
  say("");
  place.replaceChildren(el("div", { class: "failed", role: "alert" },
    el("h2", {}, "No answer"), el("p", {}, problem.message),
    again && el("button", { type: "button", onclick: again }, "Try again")));
}

export function go(part, parameters, replace = false) {
  const query = new URLSearchParams();
  for (const [key, value] of Object.entries(parameters)) {
    if (value !== undefined && value !== null && value !== "") query.set(key, value);
  }
  const target = `#/${part}${query.size ? `?${query}` : ""}`;
  if (target === location.hash) window.dispatchEvent(new HashChangeEvent("hashchange"));
  else if (replace) {
    history.replaceState(null, "", target);
    window.dispatchEvent(new HashChangeEvent("hashchange"));
  } else location.hash = target;
}
