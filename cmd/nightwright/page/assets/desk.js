// The desk: what is on it, and how its parts talk to each other.
import { get, key } from "./api.js";
import { el, one, svg, clock, localClock, stamp, fixed, many, series } from "./shapes.js";
import { Ribbon } from "./ribbon.js";
import { Lanes } from "./lanes.js";
import { Dome } from "./dome.js";
import { Story } from "./story.js";
import { Redo } from "./redo.js";

const desk = { survey: null, fields: [], nights: null, night: null, which: "current", site: 0, moment: 0, chosen: -1, tonight: new Set(), marks: [] };
export const say = (what) => { const t = one("trouble"); t.textContent = what; t.hidden = !what; };
const trial = () => (desk.which === "trial" ? { plan: "trial" } : {});

const ribbon = new Ribbon(one("ribbon"), (k) => open(desk.nights.nights[k]));
const lanes = new Lanes(one("lanes"), {
  field: (i) => story.tell(i),
  moment: (t) => setMoment(t),
  site: (k) => { if (k !== desk.site) { desk.site = k; one("site").value = k; paint(); } },
  mark: (telescope, from, to) => redo.add({ telescope, from, to }),
});
const dome = new Dome(one("dome"), (i) => story.tell(i));
const story = new Story(desk, { chosen: (i) => { desk.chosen = i; lanes.choose(i); paint(); }, night: open, query: trial });
const redo = new Redo(desk, {
  marks: () => desk.night && lanes.set(desk.night, desk.survey, desk.marks),
  reload: (which) => { desk.which = which; return load(true); }, night: open, say,
});

function verdict(p) {
  const part = desk.which === "trial" ? "on trial: " : "";
  one("verdict").replaceChildren(part, el("b", {}, `coverage ${fixed(p.coverage, 4)}`), ` of at most ${fixed(p.ceiling, 4)} (gap ${fixed(100 * p.gap, 1)} %) · visits ${many(p.visits_got)} of ${many(p.visits_wanted)} · fields finished ${many(p.fields_finished)} of ${many(p.fields_wanted)} · ${fixed(100 * p.used_hours / (p.open_hours || 1), 0)} % of open time used`);
}

async function load(again) {
  try {
    const [survey, nights, fields] = await Promise.all([get("/api/survey"), get("/api/nights", trial()), get("/api/fields", trial())]);
    desk.survey = survey;
    desk.nights = nights;
    desk.fields = fields;
    if (!again) first();
    verdict(desk.which === "trial" ? survey.trial.after : survey.plan);
    ribbon.set(nights, one("shade").value);
    story.names();
    redo.show(survey.trial);
    say("");
    await open(desk.night?.night ?? busiest());
  } catch (e) { say(e.message); }
}

// first fills in what stays the same.
function first() {
  const s = desk.survey;
  document.title = `${s.survey}: night desk`;
  one("survey").textContent = s.survey;
  one("locked").hidden = Boolean(key);
  one("site").replaceChildren(...s.sites.map((x, k) => el("option", { value: k }, x.name)));
  one("programs").replaceChildren(...s.programs.map((p, k) => el("span", {}, svg("svg", { width: 12, height: 12, "aria-hidden": "true" }, svg("rect", { width: 12, height: 12, class: "f-" + series(k) })), p)));
  const date = one("date");
  date.min = s.first_night;
  date.max = s.last_night;
  redo.first();
}

// busiest is the night that is opened at first: today's, else the dearest.
function busiest() {
  const today = new Date().toISOString().slice(0, 10), n = desk.nights;
  if (n.nights.includes(today)) return today;
  const worth = n.nights.map((_, k) => n.telescopes.reduce((s, t) => s + t.price_millionths[k] * t.used_hours[k], 0));
  return n.nights[worth.indexOf(Math.max(...worth))];
}

let asked = 0;
async function open(label) {
  const turn = ++asked;
  ribbon.mark(desk.nights.nights.indexOf(label));
  one("date").value = label;
  try {
    const night = await get(`/api/nights/${label}`, trial());
    if (turn !== asked) return; // another was asked for meanwhile
    const same = desk.night?.night === label;
    desk.night = night;
    desk.tonight = new Set(night.lanes.flatMap((l) => l.visits.map((v) => v.field)));
    one("night-h").textContent = `Night ${label}`;
    const sky = night.sites[desk.site];
    one("night-about").textContent = `${night.lanes.reduce((n, l) => n + l.visits.length, 0)} exposures, Moon ${fixed(100 * sky.moon_illumination, 0)} %`;
    one("report").href = `/report?night=${label}`;
    lanes.set(night, desk.survey, desk.marks);
    lanes.choose(desk.chosen);
    const m = one("moment");
    m.min = night.from;
    m.max = night.to;
    sheets(night);
    setMoment(same ? desk.moment : (night.lanes.find((l) => l.visits.length)?.visits[0].start ?? (night.from + night.to) / 2));
  } catch (e) { say(e.message); }
}

// sheets puts a link to each telescope's list beside the night.
function sheets(night) {
  const box = one("night-about");
  for (const l of night.lanes) if (l.visits.length && desk.which === "current") {
    box.append(" · ", el("a", { href: `/sheet?${new URLSearchParams({ telescope: l.telescope, night: night.night })}`, target: "_blank", rel: "noopener" }, `sheet ${l.telescope}`),
      " ", el("a", { href: `/sheet?${new URLSearchParams({ telescope: l.telescope, night: night.night, form: "csv" })}`, "aria-label": `sheet ${l.telescope} as CSV` }, "csv"));
  }
}

function setMoment(t) {
  desk.moment = Math.max(desk.night.from, Math.min(desk.night.to, t));
  one("moment").value = desk.moment;
  paint();
}

let waiting = false;
function paint() { // at most once a frame, however fast the slider is dragged
  if (waiting || !desk.night) return;
  waiting = true;
  requestAnimationFrame(() => {
    waiting = false;
    const t = desk.moment, site = desk.survey.sites[desk.site];
    const watched = lanes.watched(t);
    lanes.moment(t);
    const sky = dome.draw(desk.night, desk.survey, desk.fields, desk.site, t, desk.tonight, watched, desk.chosen);
    one("clock").textContent = `${stamp(t).slice(0, 10)} ${clock(t)} UTC, ${localClock(t, site.time_zone)} at ${site.name}`;
    one("now").textContent = watched.length ? watched.map((w) => `${w.telescope}: ${w.name} in ${w.filter}, altitude ${fixed(w.altitude_deg, 0)}°`).join(" · ") : "no exposure at this moment";
    const moon = sky.moon.altitude > 0 ? `Moon up, altitude ${fixed((sky.moon.altitude * 180) / Math.PI, 0)}°` : "Moon down";
    one("sky-about").textContent = `${site.name}: ${sky.up} fields above the horizon; Sun at ${fixed(sky.sun, 0)}°, ${moon}. Coloured: observed this night.`;
  });
}

one("moment").addEventListener("input", (e) => { desk.moment = Number(e.target.value); paint(); });
one("zoom").addEventListener("change", (e) => lanes.zoom(Number(e.target.value)));
one("site").addEventListener("change", (e) => { desk.site = Number(e.target.value); paint(); });
one("shade").addEventListener("change", (e) => ribbon.set(desk.nights, e.target.value));
one("date").addEventListener("change", (e) => { if (desk.nights.nights.includes(e.target.value)) open(e.target.value); });
const turn = (by) => { const k = ribbon.at + by; if (k >= 0 && k < desk.nights.nights.length) open(desk.nights.nights[k]); };
one("earlier").addEventListener("click", () => turn(-1));
one("later").addEventListener("click", () => turn(1));
for (const r of document.getElementsByName("which")) r.addEventListener("change", () => { desk.which = r.value; load(true); });
matchMedia("(prefers-color-scheme: dark)").addEventListener("change", () => { dome.inks = null; paint(); });
window.desk = desk; // for whoever looks with the browser's tools
load(false);
