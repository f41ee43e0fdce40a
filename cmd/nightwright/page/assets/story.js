// A field's story: what it wants and gets, when, and what is in its way.
import { get } from "./api.js";
import { el, one, svg, clock, fixed, many, table, stamp } from "./shapes.js";

export class Story {
  constructor(desk, on) {
    this.desk = desk;
    this.on = on;
    one("find").addEventListener("change", (e) => {
      const i = desk.fields.findIndex((f) => f.field === e.target.value);
      if (i >= 0) this.tell(i);
    });
  }

  names() {
    const list = one("names");
    if (this.desk.fields.length <= 3000) list.replaceChildren(...this.desk.fields.map((f) => el("option", { value: f.field })));
  }

  async tell(i) {
    const d = this.desk, f = d.fields[i], box = one("story-text");
    this.on.chosen(i);
    one("story-h").textContent = `Field ${f.field}`;
    one("find").value = f.field;
    try {
      const s = await get("/api/field", { name: f.field, ...this.on.query() });
      if (d.chosen !== i) return;
      box.replaceChildren(
        el("p", {}, `${d.survey.programs[s.program]}, weight ${s.weight}; right ascension ${fixed(s.ra_deg, 3)}°, declination ${fixed(s.dec_deg, 3)}°`),
        el("p", {}, el("b", {}, `${many(s.planned + s.done)} of ${many(s.wanted)} visits`), `, coverage ${fixed(s.coverage, 3)}; usable ${fixed(s.usable_hours, 1)} h`),
        el("p", {}, s.why),
        this.altitudes(i),
        this.explain(f.field),
        this.visits(s.visits),
      );
    } catch (e) { box.replaceChildren(el("p", { class: "soft" }, e.message)); }
  }

  // altitudes draws the field's altitude through the night at each site.
  altitudes(i) {
    const n = this.desk.night, wide = 360, tall = 110;
    const s = svg("svg", { viewBox: `0 0 ${wide} ${tall}`, width: "100%", role: "img", "aria-label": "Altitude of the field through the night, a line for each site" });
    const x = (t) => 26 + ((t - n.from) / (n.to - n.from)) * (wide - 30), y = (a) => 92 - (a / 90) * 86;
    s.append(svg("rect", { x: 26, y: 6, width: wide - 30, height: 86, class: "f-panel" }));
    for (const a of [0, 30, 60, 90]) s.append(svg("line", { x1: 26, x2: wide - 4, y1: y(a), y2: y(a), class: "l-grid" }), svg("text", { x: 22, y: y(a) + 4, class: "s", "text-anchor": "end" }, a));
    this.desk.survey.sites.forEach((site, k) => {
      const lat = (site.latitude_deg * Math.PI) / 180, lon = (site.longitude_deg * Math.PI) / 180;
      const altitude = (t) => {
        const h = n.ha[i] + lon + n.rate * (t - n.at);
        return (Math.asin(Math.sin(lat) * Math.sin(n.dec[i]) + Math.cos(lat) * Math.cos(n.dec[i]) * Math.cos(h)) * 180) / Math.PI;
      };
      let path = "", pen = "M";
      const [from, to] = n.sites[k].sun_down.length ? [n.sites[k].sun_down[0][0], n.sites[k].sun_down.at(-1)[1]] : [n.from, n.to];
      for (let j = 0; j <= 60; j++) {
        const t = from + ((to - from) * j) / 60, a = altitude(t);
        if (a < 0) { pen = "M"; continue; }
        path += `${pen}${fixed(x(t), 1)} ${fixed(y(a), 1)}`;
        pen = "L";
      }
      s.append(svg("path", { d: path || "M0 0", class: `nofill l-s${k % 7}`, "stroke-width": 2 }, svg("title", {}, site.name)));
    });
    for (let t = Math.ceil(n.from / 10800) * 10800; t < n.to; t += 10800) s.append(svg("text", { x: x(t), y: 106, class: "s", "text-anchor": "middle" }, clock(t)));
    const names = this.desk.survey.sites.map((x, k) => el("span", {}, svg("svg", { width: 16, height: 10, "aria-hidden": "true" }, svg("path", { d: "M0 5H16", class: `l-s${k % 7}`, "stroke-width": 2 })), x.name));
    return el("figure", {}, s, el("figcaption", { class: "key" }, ...names));
  }

  explain(name) {
    const out = el("div", {});
    const button = el("button", { type: "button", onclick: async () => {
      button.disabled = true;
      button.textContent = "looking";
      try {
        out.replaceChildren(...reasons(await get("/api/explain", { name, ...this.on.query() })));
      } catch (e) { out.replaceChildren(el("p", { class: "soft" }, e.message)); }
    } }, "Why is it where it is, or isn't?");
    out.append(button);
    return out;
  }

  visits(list) {
    const t = el("table");
    t.append(...table(["night", "start UTC", "telescope", "filter", "alt", "quality"], list.map((v) => [
      el("button", { type: "button", class: "link", onclick: () => this.on.night(v.night) }, v.night), stamp(v.start).slice(11, 16), v.telescope, v.filter, fixed(v.altitude_deg, 0), fixed(v.quality, 2),
    ]), [4, 5]));
    return el("div", { class: "scroll tall", tabindex: 0, role: "region", "aria-label": "Visits of the field" }, t);
  }
}

const day = (n) => new Date(n * 86400000).toISOString().slice(0, 10);
const worth = (x) => (x * 1e6).toPrecision(3);
const why = {
  over: "it is over", cadence: "too near to a visit that the field has", taken: "visits stand there that are worth more", price: "its time is worth more than the visit",
  possible: "what stands there is worth less, but moving it moves more", empty: "nothing stands there: the search passed it by",
};

// reasons writes what the explanation of a field says.
function reasons(e) {
  return e.demands.flatMap((d) => {
    const rules = (d.rules ?? []).slice(0, 5), windows = (d.windows ?? []).slice(0, 6), helps = d.helps ?? [], months = d.months ?? [];
    const put = (head, rows, numeric) => { const t = el("table"); t.append(...table(head, rows, numeric)); return el("div", { class: "scroll", tabindex: 0, role: "region", "aria-label": head[0] }, t); };
    return [
      el("h3", {}, `${d.name}: ${d.got} of ${d.wanted} visits`),
      el("p", { class: "soft" }, `A visit of full quality is worth ${worth(d.worth)} millionths of coverage.`),
      months.length ? put(["month", "dark and up, h", "usable, h"], months.map((m) => [m.name, fixed(m.before_h, 1), fixed(m.after_h, 1)]), [1, 2]) : null,
      rules.length ? put(["rule", "takes, h", "it alone, h"], rules.map((r) => [r.rule, fixed(r.in_turn_h, 1), fixed(r.only_h, 1)]), [1, 2]) : null,
      windows.length ? put(["could have been", "worth", "costs", "why not"], windows.map((w) => [
        `${w.telescope} ${day(w.night_days)} ${clock(w.from_unix_s)}-${clock(w.to_unix_s)}`, worth(w.worth), worth(w.price),
        (why[w.why] ?? w.why) + ((w.rivals ?? []).length ? `: ${w.rivals.slice(0, 3).map((r) => r.field).join(", ")}` : ""),
      ]), [1, 2]) : null,
      helps.length ? el("p", {}, "What would help:") : null,
      helps.length ? el("ul", {}, ...helps.map((h) => el("li", {}, h.what + (h.hours ? ` (opens ${fixed(h.hours, 1)} h)` : "")))) : null,
    ].filter(Boolean);
  });
}
