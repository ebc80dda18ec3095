// The page that stands in for the desk: lists the packs stored here, and goes back when the desk answers.

import { link, storedPacks } from "./stored.js";

async function packs() {
  const found = await storedPacks();
  document.getElementById("packs-title").hidden = found.length === 0;
  for (const pack of found) {
    const item = document.createElement("li");
    item.append(link(pack));
    document.getElementById("packs").append(item);
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
