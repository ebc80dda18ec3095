// What the reader can do: keys, pointer and touch on map and ribbon, and the buttons.
"use strict";

(() => {
  const { $, root, state } = PAGE, PAN = 0.2, ZOOM = 1.5, STEP_MS = 400;
  let running = 0;

  const on = (id, does, event = "click") => $(id).addEventListener(event, does);

  // ---- time ----

  on("time", () => PAGE.show(Number($("time").value)), "input");

  function sweep(event) {
    const { places, width } = PAGE.places(), box = $("ribbon-picture").getBoundingClientRect();
    const x = ((event.clientX - box.left) / box.width) * width;
    const index = places.reduce((best, p, i) => (Math.abs(p - x) < Math.abs(places[best] - x) ? i : best), 0);
    if (index !== state.index) PAGE.show(index);
  }
  on("ribbon", (event) => {
    if (event.button !== 0 || PAGE.head.seconds.length === 1) return;
    $("ribbon").setPointerCapture(event.pointerId);
    $("time").focus({ preventScroll: true, focusVisible: false });
    sweep(event);
  }, "pointerdown");
  on("ribbon", (event) => event.buttons === 1 && $("ribbon").hasPointerCapture(event.pointerId) && sweep(event), "pointermove");

  function halt() {
    clearInterval(running);
    running = 0;
    $("run-on").textContent = "Let time run";
    $("answer").setAttribute("aria-live", "polite");
  }
  on("run-on", () => {
    if (running) return halt();
    $("run-on").textContent = "Hold time";
    $("answer").setAttribute("aria-live", "off"); // thirty sentences a minute help nobody
    if (state.index === PAGE.head.seconds.length - 1) PAGE.show(0);
    running = setInterval(() => (state.index + 1 < PAGE.head.seconds.length ? PAGE.show(state.index + 1) : halt()), STEP_MS);
    return undefined;
  });

  // ---- map ----

  const fingers = new Map();
  let moved = 0, spread = 0;
  const place = (event) => {
    const box = $("map").getBoundingClientRect();
    return [event.clientX - box.left, event.clientY - box.top];
  };
  on("map", (event) => {
    if (event.button !== 0) return;
    $("map").setPointerCapture(event.pointerId);
    if (!fingers.size) moved = 0;
    fingers.set(event.pointerId, place(event));
    spread = 0;
  }, "pointerdown");
  on("map", (event) => {
    const before = fingers.get(event.pointerId);
    if (!before) return;
    const now = place(event);
    fingers.set(event.pointerId, now);
    moved += Math.hypot(now[0] - before[0], now[1] - before[1]);
    if (fingers.size === 1 && moved > 6) {
      const { step } = PAGE.view();
      PAGE.lookAt(state.x - (now[0] - before[0]) * step, state.y + (now[1] - before[1]) * step, state.width);
    } else if (fingers.size === 2) {
      const [[ax, ay], [bx, by]] = fingers.values(), apart = Math.hypot(bx - ax, by - ay);
      if (spread > 0 && apart > 0) PAGE.zoom(spread / apart, (ax + bx) / 2, (ay + by) / 2);
      spread = apart;
    }
  }, "pointermove");
  on("map", (event) => {
    const held = fingers.get(event.pointerId);
    fingers.delete(event.pointerId);
    if (held && !fingers.size && moved <= 6) PAGE.letGo(...PAGE.view().at(...held));
  }, "pointerup");
  on("map", (event) => fingers.delete(event.pointerId), "pointercancel");
  $("map").addEventListener("wheel", (event) => {
    // A wheel over the map scrolls the page, as the reader expects, unless the map has the focus.
    if (!event.ctrlKey && document.activeElement !== $("map")) return;
    event.preventDefault();
    PAGE.zoom(event.deltaY > 0 ? 1.2 : 1 / 1.2, ...place(event));
  }, { passive: false });
  on("map", (event) => {
    const { width } = state, pan = PAN * width;
    const does = {
      ArrowLeft: () => PAGE.lookAt(state.x - pan, state.y, width), ArrowRight: () => PAGE.lookAt(state.x + pan, state.y, width),
      ArrowUp: () => PAGE.lookAt(state.x, state.y + pan, width), ArrowDown: () => PAGE.lookAt(state.x, state.y - pan, width),
      "+": () => PAGE.zoom(1 / ZOOM), "=": () => PAGE.zoom(1 / ZOOM), "-": () => PAGE.zoom(ZOOM), Enter: () => PAGE.letGo(state.x, state.y),
    }[event.key];
    if (!does || event.ctrlKey || event.metaKey || event.altKey) return;
    event.preventDefault();
    does();
  }, "keydown");
  on("nearer", () => PAGE.zoom(1 / ZOOM));
  on("further", () => PAGE.zoom(ZOOM));
  on("whole", PAGE.whole);
  on("near", PAGE.near);
  on("let-go", () => PAGE.letGo(state.x, state.y));
  on("clear", () => {
    state.parcels.length = 0;
    $("clear").disabled = true;
    $("parcel").textContent = "";
    PAGE.draw();
  });

  // ---- what is shown ----

  on("table", (event) => {
    const row = event.target.closest("tr[data-value]");
    if (row) PAGE.show(state.index, row.dataset.value);
  });
  on("sections", () => {
    state.section = Number($("sections").value);
    PAGE.section();
    PAGE.draw();
  }, "change");
  on("run", async () => {
    halt();
    await PAGE.open(Number($("run").value));
    PAGE.near();
  }, "change");

  function dress(name, value, button, pressed) {
    if (pressed) root.dataset[name] = value;
    else delete root.dataset[name];
    $(button).setAttribute("aria-pressed", pressed);
    PAGE.dressed();
  }
  on("night", () => dress("mode", "night", "night", root.dataset.mode !== "night"));
  on("hall", () => dress("view", "hall", "hall", root.dataset.view !== "hall"));
  on("stop-before", () => PAGE.stop(state.stop - 1));
  on("stop-next", () => PAGE.stop(state.stop + 1));
  document.addEventListener("keydown", (event) => {
    // Page keys walk through the saved views wherever the focus is.
    const way = { PageDown: 1, PageUp: -1 }[event.key], to = state.stop + way;
    if (!way || !PAGE.pack?.stops[to]) return;
    event.preventDefault();
    PAGE.stop(to);
  });

  PAGE.narrow.addEventListener("change", PAGE.dressed);
  new ResizeObserver(PAGE.draw).observe($("map"));
  if (matchMedia("(prefers-color-scheme: dark)").matches) root.dataset.mode = "night";
  $("night").setAttribute("aria-pressed", root.dataset.mode === "night");

  PAGE.begin().then(() => document.fonts.ready).then(PAGE.draw).catch((error) => {
    $("answer").textContent = error.message;
    root.dataset.ready = "no";
    console.error(error);
  });
  if ("serviceWorker" in navigator && location.protocol.startsWith("http") && document.querySelector("link[rel=manifest]")) {
    navigator.serviceWorker.register("sw.js").catch((error) => console.warn(`This pack cannot be kept on this machine: ${error.message}`));
  }
})();
