// Answers when the desk does not, with one page that says so. Panel's own pages are never stored; a pack keeps itself.

const VERSION = "{{version}}";
const CACHE = `leewater-desk-${VERSION}`;
const FIRST = [{{files}}];

self.addEventListener("install", (e) => {
  e.waitUntil(caches.open(CACHE).then((cache) => cache.addAll(FIRST)).then(() => self.skipWaiting()));
});

self.addEventListener("activate", (e) => {
  const old = (names) => names.filter((name) => name.startsWith("leewater-desk-") && name !== CACHE);
  e.waitUntil(
    caches
      .keys()
      .then((names) => Promise.all(old(names).map((name) => caches.delete(name))))
      .then(() => self.clients.claim()),
  );
});

self.addEventListener("fetch", (e) => {
  const url = new URL(e.request.url);
  if (e.request.method !== "GET" || url.origin !== location.origin) return;
  if (url.pathname === "/ping" || url.pathname.endsWith("/ws")) return;
  if (e.request.mode === "navigate") e.respondWith(fetch(e.request).catch(() => caches.match("/web/offline.html")));
  else if (url.pathname.startsWith("/static/")) e.respondWith(storedElseFresh(e.request));
  else if (/^\/(web|icons)\//.test(url.pathname)) e.respondWith(freshElseStored(e.request));
});

async function storedElseFresh(request) {
  const stored = await caches.match(request);
  if (stored) return stored;
  const answer = await fetch(request);
  if (answer.ok) (await caches.open(CACHE)).put(request, answer.clone());
  return answer;
}

async function freshElseStored(request) {
  try {
    const answer = await fetch(request);
    if (answer.ok) (await caches.open(CACHE)).put(request, answer.clone());
    return answer;
  } catch (error) {
    const stored = await caches.match(request, { ignoreSearch: true });
    if (stored) return stored;
    throw error;
  }
}
