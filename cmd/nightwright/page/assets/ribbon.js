// The season as a ribbon: a column a night, a row a telescope, the Moon on top.
import { svg, one, ramp } from "./shapes.js";

export class Ribbon {
  constructor(box, choose) {
    this.box = box;
    this.choose = choose;
    this.at = 0;
    box.addEventListener("pointerdown", (e) => this.pick(e));
    box.addEventListener("pointermove", (e) => e.buttons === 1 && this.pick(e));
    box.addEventListener("keydown", (e) => {
      const step = { ArrowLeft: -1, ArrowRight: 1, PageUp: -7, PageDown: 7, Home: -1e6, End: 1e6 }[e.key];
      if (step === undefined || !this.data) return;
      e.preventDefault();
      this.choose(Math.max(0, Math.min(this.data.nights.length - 1, this.at + step)));
    });
    new ResizeObserver(() => this.draw()).observe(box);
  }

  pick(e) {
    if (!this.data) return;
    const r = this.box.getBoundingClientRect();
    const n = this.data.nights.length;
    const k = Math.floor(((e.clientX - r.left - this.left) / (r.width - this.left)) * n);
    if (k >= 0 && k < n && k !== this.at) this.choose(k);
  }

  set(data, shade) { this.data = data; this.shade = shade; this.draw(); }

  mark(k) {
    this.at = k;
    this.box.setAttribute("aria-valuemax", this.data.nights.length - 1);
    this.box.setAttribute("aria-valuenow", k);
    this.box.setAttribute("aria-valuetext", this.data.nights[k]);
    this.place();
  }

  place() {
    if (!this.frame) return;
    this.frame.setAttribute("x", this.left + this.at * this.step - 1);
    this.frame.setAttribute("width", Math.max(this.step, 4) + 2);
  }

  draw() {
    const d = this.data, wide = this.box.clientWidth;
    if (!d || !wide) return;
    const rows = d.telescopes.length, high = rows > 8 ? 9 : 14, moon = 16, foot = 18;
    this.left = 74;
    this.step = (wide - this.left) / d.nights.length;
    const s = svg("svg", { viewBox: `0 0 ${wide} ${moon + rows * (high + 2) + foot}`, height: moon + rows * (high + 2) + foot, "aria-hidden": "true" });
    let dear = 0;
    for (const t of d.telescopes) dear = Math.max(dear, ...t.price_millionths);
    s.append(svg("text", { x: 0, y: 12, class: "s" }, "Moon"));
    d.moon_illumination.forEach((m, k) => s.append(svg("rect", {
      x: this.left + k * this.step, y: 2, width: Math.max(this.step - 0.6, 0.8), height: 11, class: "f-moon", opacity: (0.12 + 0.88 * m).toFixed(2),
    }, svg("title", {}, `${d.nights[k]}: Moon ${(100 * m).toFixed(0)} %`))));
    d.telescopes.forEach((t, row) => {
      const y = moon + row * (high + 2);
      s.append(svg("text", { x: 0, y: y + high - 3, class: "s" }, t.telescope.slice(0, 11)));
      t.open_hours.forEach((open, k) => {
        const part = this.shade === "used" ? t.used_hours[k] / open : t.price_millionths[k] / (dear || 1);
        s.append(svg("rect", {
          x: this.left + k * this.step, y, width: Math.max(this.step - 0.6, 0.8), height: high,
          class: open > 0 ? "f-" + ramp(part) : "f-panel l-axis", "stroke-width": open > 0 ? 0 : 0.6,
        }, svg("title", {}, `${d.nights[k]}, ${t.telescope}: ${t.used_hours[k].toFixed(1)} of ${open.toFixed(1)} h used, ${t.visits[k]} visits, ${t.price_millionths[k].toFixed(0)} millionths an hour`)));
      });
    });
    const every = Math.ceil(78 / this.step);
    d.nights.forEach((n, k) => {
      if (k % every === 0 && k * this.step < wide - this.left - 66) s.append(svg("text", { x: this.left + k * this.step, y: moon + rows * (high + 2) + 13, class: "s" }, n));
    });
    this.frame = svg("rect", { y: 0, height: moon + rows * (high + 2), class: "nofill chosen", rx: 2 });
    s.append(this.frame);
    this.place();
    this.box.replaceChildren(s);
    const key = one("shade-key");
    key.replaceChildren();
    const bar = svg("svg", { width: 72, height: 12, "aria-hidden": "true" });
    for (let k = 0; k < 6; k++) bar.append(svg("rect", { x: k * 12, y: 0, width: 12, height: 12, class: "f-r" + k }));
    key.append("0 ", bar, this.shade === "used" ? "100 %" : `${dear.toFixed(0)} millionths of coverage`);
  }
}
