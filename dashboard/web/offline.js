// The page that stands in for the desk: lists the packs stored here, and goes back when the desk answers.

const list = document.getElementById("packs");

async function packs() {
  const found = new Set();
  for (const name of await caches.keys()) {
    for (const request of await (await caches.open(name)).keys()) {
      const match = new URL(request.url).pathname.match(/^\/pack\/(.*)index\.html$/);
      if (match) found.add(`/pack/${match[1]}index.html`);
    }
  }
  document.getElementById("packs-title").hidden = found.size === 0;
  for (const path of found) {
    const link = document.createElement("a");
    link.href = path;
    link.className = "plain first";
    link.textContent = `Open ${decodeURIComponent(path.replace("/pack/", "").replace("/index.html", "").replace("index.html", "")) || "the pack"}`;
    const item = document.createElement("li");
    item.append(link);
    list.append(item);
  }
}

async function back() {
  try {
    await fetch("/ping", { cache: "no-store" });
    location.reload();
  } catch {
    setTimeout(back, 1000);
  }
}

packs();
setTimeout(back, 1000);
