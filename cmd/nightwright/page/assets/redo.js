// Marks of lost time, planning again with them, and what would change.
import { change, follow, key } from "./api.js";
import { el, one, stamp, fixed, many, table, clock } from "./shapes.js";

const instant = (text) => { const t = Date.parse(text.trim().replace(/Z?$/, "Z").replace(" ", "T")); return Number.isNaN(t) ? null : t / 1000; };

export class Redo {
  constructor(desk, on) {
    this.desk = desk;
    this.on = on;
    one("add").addEventListener("submit", (e) => this.typed(e));
    one("redo").addEventListener("submit", (e) => { e.preventDefault(); this.start(); });
    one("work-cancel").addEventListener("click", () => this.job && change("DELETE", `/api/jobs/${this.job}`).catch((e) => on.say(e.message)));
    one("accept").addEventListener("click", () => this.accept());
    one("drop").addEventListener("click", () => this.drop());
  }

  first() {
    const s = this.desk.survey;
    one("add-where").replaceChildren(
      ...s.telescopes.map((t) => el("option", { value: "t" + t.name }, t.name)),
      ...s.sites.map((x) => el("option", { value: "s" + x.name }, `all of ${x.name}`)));
    one("add-cause").replaceChildren(...s.causes.map((c) => el("option", {}, c)));
    for (const b of ["accept", "drop"]) one(b).disabled = !key;
    one("redo").querySelector("button").disabled = !key;
    this.list();
  }

  add(mark) {
    this.desk.marks.push({ cause: this.desk.survey.causes[0], why: "", ...mark });
    this.list();
    this.on.marks();
  }

  typed(e) {
    e.preventDefault();
    const from = instant(one("add-from").value), to = instant(one("add-to").value), where = one("add-where").value;
    if (from === null || to === null || to <= from) { this.on.say("Lost time wants two instants in UTC, such as 2027-03-09T02:00Z, the second after the first."); return; }
    this.on.say("");
    this.add({ [where[0] === "t" ? "telescope" : "site"]: where.slice(1), from, to, cause: one("add-cause").value, why: one("add-why").value });
  }

  list() {
    const d = this.desk;
    one("marks").replaceChildren(...d.marks.map((m, k) => el("li", {},
      `${m.telescope ?? "all of " + m.site}, ${stamp(m.from)} to ${stamp(m.to)} `,
      el("select", { "aria-label": "cause", onchange: (e) => { m.cause = e.target.value; } }, ...d.survey.causes.map((c) => el("option", { selected: c === m.cause }, c))), " ",
      el("button", { type: "button", "aria-label": `take the mark ${k + 1} away`, onclick: () => { d.marks.splice(k, 1); this.list(); this.on.marks(); } }, "take away"))));
  }

  async start() {
    const d = this.desk, typed = one("redo-now").value.trim();
    const now = typed ? instant(typed) : null;
    if (typed && now === null) { this.on.say("The instant wants UTC, such as 2027-03-09T02:00Z."); return; }
    const ask = {
      losses: d.marks.map((m) => ({ telescope: m.telescope, site: m.site, from: full(m.from), to: full(m.to), cause: m.cause, why: m.why || undefined })),
      now: now === null ? "" : full(now), hold_hours: Number(one("redo-hold").value) || 0, stability: Number(one("redo-stability").value),
    };
    try {
      this.on.say("");
      const begun = await change("POST", "/api/trial", ask);
      this.job = begun.job;
      one("work").hidden = false;
      const end = await follow(begun.job, (s) => {
        const bar = one("work-bar");
        if (s.total > 0) bar.value = s.done / s.total; else bar.removeAttribute("value");
        one("work-text").textContent = s.phase + (s.coverage ? `: coverage ${fixed(s.coverage, 4)}` : "");
      });
      if (end.state === "failed") throw new Error(end.error);
      if (end.state === "cancelled") { this.on.say("Cancelled; nothing changed."); return; }
      one("work-text").textContent = "";
      await this.on.reload("trial");
      for (const r of document.getElementsByName("which")) r.checked = r.value === "trial";
      one("trial-h").focus();
    } catch (e) { this.on.say(e.message); } finally { one("work").hidden = true; this.job = 0; }
  }

  // show tells what the plan on trial would change, or hides that.
  show(t) {
    one("trial").hidden = one("which").hidden = !t;
    this.trial = t;
    if (!t) return;
    const b = t.before, a = t.after, by = (x, n) => { const t = fixed(x, n); return Number(t) > 0 ? "+" + t : Number(t) === 0 ? "0" : t; };
    one("trial-table").replaceChildren(...table(["", "holds now", "on trial", "difference"], [
      ["coverage", fixed(b.coverage, 4), fixed(a.coverage, 4), by(a.coverage - b.coverage, 4)],
      ["ceiling", fixed(b.ceiling, 4), fixed(a.ceiling, 4), by(a.ceiling - b.ceiling, 4)],
      ["visits", many(b.visits_got), many(a.visits_got), by(a.visits_got - b.visits_got, 0)],
      ["fields finished", many(b.fields_finished), many(a.fields_finished), by(a.fields_finished - b.fields_finished, 0)],
      ["hours used", fixed(b.used_hours, 1), fixed(a.used_hours, 1), by(a.used_hours - b.used_hours, 1)],
    ], [1, 2, 3]));
    const words = ["kept", "moved", "dropped", "new", "lost", "done"].filter((w) => t.counts[w]).map((w) => `${many(t.counts[w])} ${w}`);
    one("trial-counts").textContent = `Exposures: ${words.join(", ")}. ${t.losses.length} mark${t.losses.length === 1 ? "" : "s"} of lost time. Planned from ${t.now} on; what the ledger doesn't tell of before that counts as not taken.`;
    const at = (name, start) => (name ? `${name} ${stamp(start).slice(0, 10)} ${clock(start)}` : "");
    one("trial-changes").replaceChildren(...table(["field", "what", "from", "to"], t.changes.slice(0, 200).map((c) => [c.field, c.what, at(c.from_telescope, c.from_start), at(c.to_telescope, c.to_start)])));
  }

  async accept() {
    try {
      await change("POST", "/api/trial/accept", { checksum: this.trial.checksum });
      this.desk.marks.length = 0;
      await this.back("Accepted: the losses are in the ledger, and the plan holds.");
    } catch (e) { this.on.say(e.message); }
  }

  async drop() {
    try {
      await change("DELETE", "/api/trial");
      await this.back("Thrown away; the plan that held still holds.");
    } catch (e) { this.on.say(e.message); }
  }

  async back(what) {
    for (const r of document.getElementsByName("which")) r.checked = r.value === "current";
    await this.on.reload("current");
    this.list();
    this.on.say(what);
  }
}

// full is an instant to the second.
function full(t) { return new Date(Math.round(t) * 1000).toISOString().slice(0, 19) + "Z"; }
