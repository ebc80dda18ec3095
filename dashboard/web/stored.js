// The packs that were opened on this machine: each has stored itself, page and all.

// Addresses and titles, by address.
export async function storedPacks() {
  const found = new Map();
  for (const name of await caches.keys()) {
    const cache = await caches.open(name);
    for (const request of await cache.keys()) {
      const path = new URL(request.url).pathname;
      const match = path.match(/^\/pack\/([^/]+)\/index\.html$/);
      if (match) found.set(path, await titleOf(await cache.match(request), decodeURIComponent(match[1])));
    }
  }
  return [...found].sort();
}

async function titleOf(page, name) {
  const title = new DOMParser().parseFromString(await page.text(), "text/html").title;
  return title ? `${title} (${name})` : name;
}

export function link([path, title]) {
  const made = document.createElement("a");
  made.href = path;
  made.className = "plain first";
  made.textContent = title;
  return made;
}
