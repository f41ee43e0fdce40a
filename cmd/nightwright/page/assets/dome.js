// The sky over a site at a moment: horizon at the rim, zenith in the middle,
// north up and east to the left, as it looks from below.
import { colour, series } from "./shapes.js";

export class Dome {
  constructor(canvas, choose) {
    this.c = canvas;
    this.choose = choose;
    this.places = [];
    const dots = window.devicePixelRatio || 1;
    canvas.width = canvas.height = 360 * dots;
    this.g = canvas.getContext("2d");
    this.g.scale(dots, dots);
    canvas.addEventListener("click", (e) => {
      const r = canvas.getBoundingClientRect();
      const x = ((e.clientX - r.left) / r.width) * 360, y = ((e.clientY - r.top) / r.height) * 360;
      let best = 100, at = -1;
      for (const [i, px, py] of this.places) {
        const d = (px - x) ** 2 + (py - y) ** 2;
        if (d < best) { best = d; at = i; }
      }
      if (at >= 0) this.choose(at);
    });
  }

  // dot gives the place of a direction on the picture, null below the horizon.
  static dot(ha, dec, sinLat, cosLat) {
    const sd = Math.sin(dec), cd = Math.cos(dec), ch = Math.cos(ha);
    const up = sinLat * sd + cosLat * cd * ch;
    if (up < 0) return null;
    const north = sd * cosLat - cd * ch * sinLat, east = -cd * Math.sin(ha);
    const flat = Math.hypot(north, east) || 1e-9;
    const r = 162 * (1 - Math.asin(Math.min(1, up)) / (Math.PI / 2));
    return [180 - (r * east) / flat, 180 - (r * north) / flat];
  }

  static body(track, t) {
    if (!track.length) return null;
    let k = track.findIndex((p) => p[0] >= t);
    if (k < 0) k = track.length - 1;
    if (k === 0) k = 1;
    const [a, b] = [track[k - 1], track[k]];
    const f = (t - a[0]) / (b[0] - a[0]);
    let turn = b[2] - a[2];
    if (turn > Math.PI) turn -= 2 * Math.PI;
    if (turn < -Math.PI) turn += 2 * Math.PI;
    return { altitude: a[1] + f * (b[1] - a[1]), azimuth: a[2] + f * turn };
  }

  draw(night, survey, fields, siteAt, t, tonight, watched, chosen) {
    const g = this.g, site = survey.sites[siteAt], lat = (site.latitude_deg * Math.PI) / 180;
    const sinLat = Math.sin(lat), cosLat = Math.cos(lat);
    const turn = (site.longitude_deg * Math.PI) / 180 + night.rate * (t - night.at);
    const sky = night.sites[siteAt];
    const sun = Dome.body(sky.sun, t), moon = Dome.body(sky.moon, t);
    const ink = this.inks || (this.inks = Object.fromEntries(["day", "dusk", "gloom", "panel", "paper", "axis", "grid", "text", "soft", "moon", "alarm", "s0", "s1", "s2", "s3", "s4", "s5", "s6"].map((n) => [n, colour(n)])));
    g.clearRect(0, 0, 360, 360);
    const low = (sun.altitude * 180) / Math.PI;
    g.fillStyle = low > -0.8 ? ink.day : low > -12 ? ink.dusk : low > -18 ? ink.gloom : ink.panel;
    g.beginPath(); g.arc(180, 180, 162, 0, 7); g.fill();
    g.strokeStyle = ink.grid; g.lineWidth = 1;
    for (const a of [30, 60]) { g.beginPath(); g.arc(180, 180, 162 * (1 - a / 90), 0, 7); g.stroke(); }
    g.strokeStyle = ink.axis; g.lineWidth = 1.5;
    g.beginPath(); g.arc(180, 180, 162, 0, 7); g.stroke();
    g.fillStyle = ink.soft; g.font = "12px system-ui, sans-serif"; g.textAlign = "center"; g.textBaseline = "middle";
    g.fillText("N", 180, 9); g.fillText("S", 180, 351); g.fillText("E", 9, 180); g.fillText("W", 351, 180);
    this.places = [];
    const groups = new Map();
    for (let i = 0; i < fields.length; i++) {
      const p = Dome.dot(night.ha[i] + turn, night.dec[i], sinLat, cosLat);
      if (!p) continue;
      this.places.push([i, p[0], p[1]]);
      const name = tonight.has(i) ? series(fields[i].program) : "axis";
      if (!groups.has(name)) groups.set(name, []);
      groups.get(name).push(p);
    }
    const size = fields.length > 2000 ? 2 : 3;
    for (const [name, points] of groups) {
      g.fillStyle = ink[name];
      const s = name === "axis" ? size - 0.6 : size + 1;
      for (const [x, y] of points) g.fillRect(x - s / 2, y - s / 2, s, s);
    }
    if (moon && moon.altitude > 0) {
      const r = 162 * (1 - moon.altitude / (Math.PI / 2));
      const x = 180 - r * Math.sin(moon.azimuth), y = 180 - r * Math.cos(moon.azimuth);
      g.fillStyle = ink.moon; g.beginPath(); g.arc(x, y, 9, 0, 7); g.fill();
      g.strokeStyle = ink.text; g.lineWidth = 1; g.stroke();
      g.fillStyle = ink.text; g.fillText("Moon", x, y + 17);
    }
    for (const w of watched.filter((x) => x.site === siteAt)) this.ring(w.field, ink.text, w.telescope, 9);
    if (chosen >= 0) this.ring(chosen, ink.alarm, "", 13);
    return { sun: low, moon, up: this.places.length };
  }

  ring(field, ink, text, r) {
    const p = this.places.find((x) => x[0] === field);
    if (!p) return;
    const g = this.g;
    g.strokeStyle = ink; g.lineWidth = 2.5;
    g.beginPath(); g.arc(p[1], p[2], r, 0, 7); g.stroke();
    if (text) {
      g.font = "600 12px system-ui, sans-serif"; g.fillStyle = ink;
      g.fillText(text, p[1], p[2] - r - 8);
      g.font = "12px system-ui, sans-serif";
    }
  }
}
