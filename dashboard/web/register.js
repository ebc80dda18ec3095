// Registers the worker that answers when the desk has stopped, and tells the open page when that happens.

import { link, storedPacks } from "./stored.js";

if ("serviceWorker" in navigator) navigator.serviceWorker.register("/sw.js");

const root = document.documentElement;
const every = 2000; // ms between questions whether the desk is there
let started = null;

async function ask() {
  try {
    const answer = await fetch("/ping", { cache: "no-store" });
    if (answer.status === 403) location.reload(); // a new desk that is shared: it says that it wants a link
    const now = (await answer.json()).started;
    if (started !== null && now !== started) location.reload(); // a new desk: its page is drawn anew
    started = now;
    lost(false);
  } catch {
    lost(true);
  }
}

function lost(gone) {
  root.dataset.lost = gone ? "yes" : "";
  const note = document.getElementById("lost");
  if (!note || note.hidden !== gone) return;
  note.hidden = !gone;
  if (gone && window.caches) offer();
}

async function offer() {
  const place = document.getElementById("lost-packs");
  const packs = await storedPacks();
  place.replaceChildren(...(packs.length ? ["These packs are stored on this machine: "] : []), ...packs.map(link));
}

setInterval(ask, every);
ask();
