// Requests to the server that this page came from. The key stands behind the
// # of the address, which browsers send to nobody; it is kept for this tab.
const fromAddress = new URLSearchParams(location.hash.slice(1)).get("key");
if (fromAddress) {
  sessionStorage.setItem("nightwright-key", fromAddress);
  history.replaceState(null, "", location.pathname);
}
export const key = sessionStorage.getItem("nightwright-key") || "";

async function answer(r) {
  const body = await r.json().catch(() => ({ error: r.statusText }));
  if (!r.ok) throw new Error(body.error || r.statusText);
  return body;
}

export async function get(path, query = {}) {
  const q = new URLSearchParams(query).toString();
  return answer(await fetch(path + (q ? "?" + q : "")));
}

export async function change(method, path, body) {
  return answer(await fetch(path, {
    method,
    headers: { "X-Nightwright-Key": key, ...(body ? { "Content-Type": "application/json" } : {}) },
    body: body ? JSON.stringify(body) : undefined,
  }));
}

// follow reports the progress of a job until it ends, and returns its end.
export function follow(id, tell) {
  return new Promise((done, fail) => {
    const events = new EventSource(`/api/jobs/${id}/events`);
    events.addEventListener("progress", (e) => tell(JSON.parse(e.data)));
    events.addEventListener("end", (e) => { events.close(); done(JSON.parse(e.data)); });
    events.onerror = async () => { // the stream broke: ask once, then let the browser try again
      try {
        const s = await get(`/api/jobs/${id}`);
        if (s.state !== "working") { events.close(); done(s); }
      } catch (e) { events.close(); fail(e); }
    };
  });
}
