// Keeps a served pack whole on this machine, so that it opens again without the server.

const VERSION = "{{version}}";
const HERE = new URL("./", location.href).pathname;
const CACHE = `leewater-pack-${HERE}-${VERSION}`;
const FILES = [{{files}}];

self.addEventListener("install", (event) => {
  event.waitUntil(caches.open(CACHE).then((cache) => cache.addAll(FILES.map((f) => new Request(f, { cache: "reload" })))).then(() => self.skipWaiting()));
});

self.addEventListener("activate", (event) => {
  const old = (name) => name.startsWith(`leewater-pack-${HERE}-`) && name !== CACHE;
  event.waitUntil(caches.keys().then((names) => Promise.all(names.filter(old).map((n) => caches.delete(n)))).then(() => self.clients.claim()));
});

// The server's answer where there is one, so that a new pack is seen at once; else what was stored.
self.addEventListener("fetch", (event) => {
  const url = new URL(event.request.url);
  if (event.request.method !== "GET" || url.origin !== location.origin) return;
  const name = url.pathname === HERE ? "index.html" : url.pathname.slice(HERE.length);
  event.respondWith(fetch(event.request).catch(async () => (await (await caches.open(CACHE)).match(name)) ?? Response.error()));
});
