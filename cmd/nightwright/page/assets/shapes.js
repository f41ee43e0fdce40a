// Small helpers: elements, SVG, times and numbers.
export function el(name, attributes = {}, ...inside) {
  const e = document.createElement(name);
  for (const [k, v] of Object.entries(attributes)) {
    if (k.startsWith("on")) e.addEventListener(k.slice(2), v);
    else if (v !== undefined && v !== false) e.setAttribute(k, v === true ? "" : v);
  }
  e.append(...inside.filter((x) => x !== undefined && x !== null).map((x) => (x instanceof Node ? x : String(x))));
  return e;
}

export function svg(name, attributes = {}, ...inside) {
  const e = document.createElementNS("http://www.w3.org/2000/svg", name);
  for (const [k, v] of Object.entries(attributes)) if (v !== undefined) e.setAttribute(k, v);
  e.append(...inside.map((x) => (x instanceof Node ? x : String(x))));
  return e;
}

export const one = (id) => document.getElementById(id);
export const clock = (t) => new Date(t * 1000).toISOString().slice(11, 16);
export const stamp = (t) => new Date(Math.round(t) * 1000).toISOString().slice(0, 16) + "Z";
export const fixed = (x, n) => x.toFixed(n);
export const many = (n) => n.toLocaleString("en-US");
export const colour = (name) => getComputedStyle(document.documentElement).getPropertyValue("--" + name).trim();
export const ramp = (part) => "r" + Math.max(0, Math.min(5, Math.floor(part * 6)));
export const series = (k) => "s" + (k % 7);

// localClock writes an instant in a site's time zone.
export function localClock(t, zone) {
  try {
    return new Intl.DateTimeFormat("en-GB", { hour: "2-digit", minute: "2-digit", timeZone: zone || "UTC" }).format(new Date(t * 1000));
  } catch { return ""; }
}

export function table(head, rows, numeric = []) {
  const cell = (tag, x, k) => el(tag, { class: numeric.includes(k) ? "n" : undefined, scope: tag === "th" ? "col" : undefined }, x);
  return [
    el("thead", {}, el("tr", {}, ...head.map((h, k) => cell("th", h, k)))),
    el("tbody", {}, ...rows.map((r) => el("tr", {}, ...r.map((x, k) => cell("td", x, k))))),
  ];
}
