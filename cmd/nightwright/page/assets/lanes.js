// The lanes of a night: a telescope a lane, all on one axis of time.
import { svg, clock, series, fixed } from "./shapes.js";

const left = 76, high = 30, row = 46;

export class Lanes {
  constructor(box, on) {
    this.box = box;
    this.on = on; // field(i), mark(telescope, from, to), site(k)
    this.chosen = -1;
    new ResizeObserver(() => this.draw()).observe(box);
  }

  // zoom shows so many hours around the moment, 0 all of the night.
  zoom(hours) { this.hours = hours; this.draw(); }

  // window is the stretch of time in sight.
  window() {
    const n = this.night, h = (this.hours || 0) * 3600;
    if (!h || h >= n.to - n.from) return [n.from, n.to];
    const from = Math.max(n.from, Math.min(n.to - h, (this.now ?? n.from) - h / 2));
    return [from, from + h];
  }

  set(night, survey, marks) { this.night = night; this.now = undefined; this.survey = survey; this.marks = marks; this.at = night.lanes.map(() => -1); this.draw(); }
  x(t) { return left + ((t - this.from) / (this.to - this.from)) * (this.wide - left); }
  t(x) { return this.from + ((x - left) / (this.wide - left)) * (this.to - this.from); }
  clip(t) { return Math.max(this.from, Math.min(this.to, t)); }

  rect(from, to, y, h, attributes, ...inside) {
    const a = this.x(this.clip(from)), b = this.x(this.clip(to));
    return svg("rect", { x: fixed(a, 1), y, width: fixed(Math.max(0, b - a), 1), height: h, ...attributes }, ...inside);
  }

  draw() {
    const n = this.night, focused = document.activeElement?.dataset?.lane;
    this.wide = this.box.clientWidth;
    if (!n || !this.wide) return;
    [this.from, this.to] = this.window();
    const tall = n.lanes.length * row + 24;
    const s = svg("svg", { viewBox: `0 0 ${this.wide} ${tall}`, height: tall, role: "group", "aria-label": `Lanes of the night ${n.night}` });
    this.groups = n.lanes.map((l, k) => this.lane(l, k, s));
    const step = [600, 1800, 3600, 7200, 10800].find((s) => ((this.wide - left) * s) / (this.to - this.from) > 44) ?? 21600;
    for (let t = Math.ceil(this.from / step) * step; t <= this.to; t += step) {
      s.append(svg("line", { x1: this.x(t), x2: this.x(t), y1: tall - 22, y2: tall - 17, class: "l-axis" }),
        svg("text", { x: this.x(t), y: tall - 4, class: "s", "text-anchor": "middle" }, clock(t)));
    }
    this.hair = svg("line", { y1: 0, y2: tall - 22, class: "hair", "pointer-events": "none" });
    s.append(this.hair);
    this.box.replaceChildren(s);
    this.moment(this.now ?? n.from);
    if (focused !== undefined) this.groups[focused]?.focus();
  }

  lane(l, k, s) {
    const y = k * row + 2, sky = this.night.sites[l.site], site = this.survey.sites[l.site].name;
    const g = svg("g", { class: "lane", tabindex: 0, role: "group", "data-lane": k, "aria-label": `${l.telescope}, ${site}: ${l.visits.length} exposures, ${fixed(l.used_hours, 1)} of ${fixed(l.open_hours, 1)} hours used. Arrow keys go through them.` });
    g.append(svg("text", { x: 0, y: y + 13 }, l.telescope.slice(0, 11)), svg("text", { x: 0, y: y + 27, class: "s" }, site.slice(0, 13)));
    g.append(this.rect(this.from, this.to, y, high, { class: "f-day edge" }));
    for (const [name, list] of [["dusk", sky.sun_down], ["gloom", sky.nautical], ["panel", sky.dark]]) for (const [a, b] of list) g.append(this.rect(a, b, y, high, { class: "f-" + name }));
    for (const [a, b] of sky.moon_up) g.append(this.rect(a, b, y + high + 2, 4, { class: "f-moon", opacity: (0.2 + 0.8 * sky.moon_illumination).toFixed(2) }));
    for (const [a, b] of l.open) g.append(this.rect(a, b, y, high, { class: "nofill l-axis" }));
    const seen = (v) => v.end > this.from && v.start < this.to;
    l.visits.filter(seen).forEach((v) => g.append(this.rect(v.start, v.end, y + 4, high - 8, {
      class: "f-" + series(v.program) + (v.field === this.chosen ? " chosen" : ""), opacity: v.state === "done" ? 0.5 : 1, "data-field": v.field,
    }, this.to - this.from < 8 * 3600 ? svg("title", {}, `${clock(v.start)} ${v.name}, ${v.filter}`) : "")));
    for (const x of l.lost) g.append(svg("g", {}, svg("title", {}, `lost: ${x.cause}`), this.rect(x.from, x.to, y, high, { class: "lost" })));
    for (const m of this.marks) if (m.telescope === l.telescope || m.site === site) g.append(this.rect(m.from, m.to, y, high, { class: "mark" }));
    this.listen(g, l, k, y);
    s.append(g);
    return g;
  }

  listen(g, l, k, y) {
    let from = 0, ghost = null, startX = 0;
    const place = (e) => { const r = this.box.getBoundingClientRect(); return e.clientX - r.left; };
    const snap = (t) => Math.round(this.clip(t) / 300) * 300;
    g.addEventListener("pointerdown", (e) => {
      if (e.button !== 0 || place(e) < left) { this.on.site(l.site); return; }
      startX = place(e);
      from = snap(this.t(startX));
      g.setPointerCapture(e.pointerId);
      const move = (m) => {
        const x = place(m);
        if (!ghost && Math.abs(x - startX) < 5) return;
        if (!ghost) { ghost = svg("rect", { y, height: high, class: "mark" }); g.append(ghost); }
        const to = snap(this.t(x)), a = this.x(Math.min(from, to)), b = this.x(Math.max(from, to));
        ghost.setAttribute("x", a);
        ghost.setAttribute("width", b - a);
      };
      const end = (u) => {
        g.removeEventListener("pointermove", move);
        g.removeEventListener("pointerup", end);
        g.removeEventListener("pointercancel", end);
        const to = snap(this.t(place(u))), dragged = ghost;
        ghost?.remove();
        ghost = null;
        if (u.type === "pointercancel") return;
        if (dragged && to !== from) { this.on.mark(l.telescope, Math.min(from, to), Math.max(from, to)); return; }
        const t = this.t(startX), at = l.visits.findIndex((v) => v.start <= t && v.end > t);
        this.on.site(l.site);
        this.on.moment(t);
        if (at >= 0) { this.at[k] = at; this.on.field(l.visits[at].field); }
      };
      g.addEventListener("pointermove", move);
      g.addEventListener("pointerup", end);
      g.addEventListener("pointercancel", end);
    });
    g.addEventListener("keydown", (e) => {
      const by = { ArrowLeft: -1, ArrowRight: 1, Home: -1e6, End: 1e6 }[e.key];
      if (by !== undefined && l.visits.length) {
        e.preventDefault();
        this.at[k] = Math.max(0, Math.min(l.visits.length - 1, this.at[k] + by));
        const v = l.visits[this.at[k]];
        this.on.site(l.site);
        this.on.moment((v.start + v.end) / 2);
        g.setAttribute("aria-label", `${clock(v.start)} ${v.name}, ${v.filter}, altitude ${fixed(v.altitude_deg, 0)} degrees`);
      } else if (e.key === "Enter" && this.at[k] >= 0) this.on.field(l.visits[this.at[k]].field);
    });
  }

  choose(field) {
    this.chosen = field;
    for (const r of this.box.querySelectorAll("[data-field]")) r.classList.toggle("chosen", Number(r.dataset.field) === field);
  }

  moment(t) {
    this.now = t;
    if (!this.hair) return;
    if (t < this.from || t > this.to) { this.draw(); return; } // it left the window
    const x = this.x(this.clip(t));
    this.hair.setAttribute("x1", x);
    this.hair.setAttribute("x2", x);
  }

  // watched lists the exposures that go on at a moment.
  watched(t) {
    return this.night.lanes.flatMap((l) => l.visits.filter((v) => v.start <= t && v.end > t).map((v) => ({ ...v, site: l.site })));
  }
}
