// The one wire between page and server: HTML goes into its places, what the reader does goes back.
// Nothing here computes a figure; the server sends finished words and drawings.

const root = document.documentElement;

export function render({ model }) {
  const page = new Desk((name, value) => model.send_msg({ name, value }));
  const show = () => page.show(model.slots, model.state);
  model.on("slots", show);
  model.on("state", show);
  show();
  page.listen();
  page.measure();
  root.dataset.ready = "yes"; // last: listeners are in place
  return document.createElement("span");
}

// Hands a file to the reader; a picture is drawn here from its SVG, at twice its size on the screen.
async function keep({ name, text, picture }) {
  const kind = name.endsWith(".csv") ? "text/csv" : "image/svg+xml";
  let blob = new Blob([text], { type: `${kind};charset=utf-8` });
  if (picture) {
    const image = new Image();
    const address = URL.createObjectURL(blob);
    image.src = address;
    await image.decode();
    const canvas = document.createElement("canvas");
    canvas.width = 2 * image.naturalWidth;
    canvas.height = 2 * image.naturalHeight;
    canvas.getContext("2d").drawImage(image, 0, 0, canvas.width, canvas.height);
    URL.revokeObjectURL(address);
    blob = await new Promise((made) => canvas.toBlob(made, "image/png"));
  }
  const link = document.createElement("a");
  link.href = URL.createObjectURL(blob);
  link.download = name;
  link.click();
  setTimeout(() => URL.revokeObjectURL(link.href), 60000);
}

class Desk {
  constructor(tell) {
    this.tell = tell;
    this.shown = {};
    this.state = {};
    this.busy = false;
    this.next = null;
  }

  // ---- from the server -------------------------------------------------------------------------

  show(slots, state) {
    for (const [name, html] of Object.entries(slots)) {
      if (this.shown[name] === html) continue;
      this.shown[name] = html;
      for (const place of document.querySelectorAll(`[data-slot="${name}"]`)) this.put(place, html);
    }
    const paired = state.pair !== this.state.pair;
    this.state = state;
    if (state.seen === this.sent) this.release();
    for (const name of ["mode", "view", "arrangement", "question", "working", "stop", "key", "pair"]) root.dataset[name] = state[name] ?? "";
    document.title = state.title;
    if (state.file && state.file.number !== this.kept) {
      this.kept = state.file.number;
      keep(state.file);
    }
    this.address(state);
    this.time(state);
    this.divider();
    this.overlay();
    if (paired) setTimeout(() => this.measure()); // the maps have another size now
  }

  put(place, html) {
    const focused = place.contains(document.activeElement) ? document.activeElement : null;
    const key = focused && (focused.id || focused.dataset.key);
    place.innerHTML = html;
    for (const field of place.querySelectorAll("input[type=text]")) field.value = sessionStorage.getItem(field.id) ?? "";
    if (key) place.querySelector(`#${CSS.escape(key)}, [data-key="${CSS.escape(key)}"]`)?.focus({ preventScroll: true });
  }

  address(state) {
    const wanted = location.pathname + (state.query ? `?${state.query}` : "");
    if (wanted === location.pathname + location.search) return;
    if (state.push) history.pushState({}, "", wanted);
    else history.replaceState({}, "", wanted);
  }

  time(state) {
    const slider = document.getElementById("time");
    if (!slider || !state.time) return;
    slider.max = state.time.last;
    slider.disabled = state.time.last === 0;
    if (!this.moving && !this.busy) slider.value = state.time.index;
    slider.setAttribute("aria-valuetext", state.time.words);
    this.cursor(Number(slider.value));
  }

  cursor(index) {
    const places = this.state.time?.places;
    if (!places || !places.length) return;
    const x = places[Math.min(index, places.length - 1)];
    for (const line of document.querySelectorAll("[data-cursor]")) line.setAttribute("transform", `translate(${x} 0)`);
  }

  // ---- to the server ---------------------------------------------------------------------------

  // Movements are sent one at a time, always the newest: the next one goes when the last was drawn.
  sweep(name, value) {
    this.next = [name, value];
    if (!this.busy) this.release();
  }

  release() {
    this.busy = false;
    if (!this.next) return;
    const [name, value] = this.next;
    this.next = null;
    this.busy = true;
    this.sent = (this.sent ?? 0) + 1;
    this.tell(name, { ...value, sent: this.sent });
  }

  listen() {
    document.addEventListener("click", (e) => {
      const button = e.target.closest("[data-do]");
      if (!button) return;
      if (button.dataset.do === "menu") {
        root.dataset.menu = root.dataset.menu === "open" ? "" : "open";
        return;
      }
      root.dataset.menu = "";
      this.tell(button.dataset.do, button.dataset.value ?? "");
    });
    document.addEventListener("change", (e) => {
      const control = e.target.closest("[data-choose]");
      if (control) this.tell(control.dataset.choose, control.value);
    });
    document.addEventListener("submit", (e) => {
      e.preventDefault();
      const form = e.target;
      this.tell(form.dataset.send, Object.fromEntries(new FormData(form)));
      for (const field of form.querySelectorAll("input[data-once]")) {
        field.value = "";
        sessionStorage.removeItem(field.id);
      }
    });
    // What is typed outlives a redrawing of the page, and the desk's stopping and coming back.
    document.addEventListener("input", (e) => {
      if (e.target.matches("input[type=text]")) sessionStorage.setItem(e.target.id, e.target.value);
    });
    const slider = document.getElementById("time");
    slider?.addEventListener("input", () => {
      this.moving = true;
      this.cursor(Number(slider.value));
      this.sweep("frame", { index: Number(slider.value) });
    });
    slider?.addEventListener("change", () => (this.moving = false));
    this.listenRibbon(slider);
    document.addEventListener("keydown", (e) => this.key(e));
    window.addEventListener("popstate", () => this.tell("address", location.search));
    let timer;
    window.addEventListener("resize", () => {
      clearTimeout(timer);
      timer = setTimeout(() => this.measure(), 120);
    });
    this.listenEnds();
    this.listenDivider();
    this.followMap();
  }

  // A press anywhere on the ribbon takes the slider to the nearest frame there.
  listenRibbon(slider) {
    const ribbon = document.getElementById("ribbon");
    if (!ribbon) return;
    const go = (e) => {
      const drawing = ribbon.querySelector("svg");
      const places = this.state.time?.places;
      if (!drawing || !places) return;
      const box = drawing.getBoundingClientRect();
      const x = ((e.clientX - box.left) / box.width) * drawing.viewBox.baseVal.width;
      let best = 0;
      places.forEach((at, i) => {
        if (Math.abs(at - x) < Math.abs(places[best] - x)) best = i;
      });
      if (Number(slider.value) === best && this.state.time.index === best) return;
      slider.value = best;
      slider.dispatchEvent(new Event("input"));
    };
    ribbon.addEventListener("pointerdown", (e) => {
      ribbon.setPointerCapture(e.pointerId);
      this.moving = true;
      go(e);
      slider.focus({ focusVisible: false, preventScroll: true });
      e.preventDefault();
    });
    ribbon.addEventListener("pointermove", (e) => ribbon.hasPointerCapture(e.pointerId) && go(e));
    ribbon.addEventListener("pointerup", () => (this.moving = false));
    ribbon.addEventListener("pointercancel", () => (this.moving = false));
  }

  key(e) {
    const typing = e.target.closest("input, textarea, select");
    if ((e.ctrlKey || e.metaKey) && e.key.toLowerCase() === "z" && !typing?.matches("[type=text], textarea")) {
      e.preventDefault();
      this.tell(e.shiftKey ? "redo" : "undo", "");
    }
    // In the hall the arrow keys walk through the saved views, unless a control has them.
    const step = { ArrowRight: "1", PageDown: "1", ArrowLeft: "-1", PageUp: "-1" }[e.key];
    if (step && root.dataset.view === "hall" && !e.target.closest("input, textarea, select, button, #map")) {
      e.preventDefault();
      this.tell("step", step);
    }
    if (e.target.id === "map") {
      const step = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1] }[e.key];
      if (step) this.tell("pan", step);
      else if (e.key === "+" || e.key === "=") this.tell("zoom", "nearer");
      else if (e.key === "-") this.tell("zoom", "farther");
      else if (e.key === "Enter") this.tell("parcel", "middle");
      else return;
      e.preventDefault();
    }
  }

  measure() {
    const width = (name) => Math.round(document.querySelector(`[data-slot="${name}"]`)?.clientWidth ?? 0);
    const map = document.getElementById("map");
    this.tell("size", {
      window: window.innerWidth,
      ratio: window.devicePixelRatio,
      ribbon: width("ribbon"),
      section: width("section"),
      map: [map?.clientWidth ?? 0, map?.clientHeight ?? 0],
    });
  }

  // ---- the divider between two runs ------------------------------------------------------------

  // It stands where the reader has it; the map follows.
  divider() {
    const layer = document.getElementById("swipe");
    if (!layer) return;
    const swipe = this.state.swipe;
    layer.hidden = !swipe;
    if (!swipe) return;
    const share = this.divided ?? swipe.share;
    layer.style.setProperty("--share", share);
    layer.querySelector(".left").textContent = swipe.left;
    layer.querySelector(".right").textContent = swipe.right;
    const slider = document.getElementById("divider");
    const percent = Math.round(100 * share);
    slider.setAttribute("aria-valuenow", percent);
    slider.setAttribute("aria-valuetext", `${swipe.left} on the left ${percent} % of the map, ${swipe.right} on the rest`);
  }

  moveDivider(share) {
    this.divided = Math.min(Math.max(share, 0), 1);
    this.divider();
    this.sweep("divider", { share: this.divided });
    clearTimeout(this.rest);
    this.rest = setTimeout(() => {
      this.divided = undefined;
      this.divider();
    }, 1500);
  }

  listenDivider() {
    const slider = document.getElementById("divider");
    if (!slider) return;
    slider.addEventListener("pointerdown", (e) => {
      e.preventDefault();
      e.stopPropagation();
      slider.focus({ focusVisible: false, preventScroll: true });
      slider.setPointerCapture(e.pointerId);
    });
    slider.addEventListener("pointermove", (e) => {
      if (!slider.hasPointerCapture(e.pointerId)) return;
      const box = document.getElementById("map").getBoundingClientRect();
      this.moveDivider((e.clientX - box.left) / box.width);
    });
    slider.addEventListener("keydown", (e) => {
      const share = this.divided ?? this.state.swipe.share;
      const step = (e.shiftKey ? 10 : 2) / 100;
      const to = {
        ArrowLeft: share - step, ArrowDown: share - step, ArrowRight: share + step, ArrowUp: share + step,
        PageDown: share - 0.1, PageUp: share + 0.1, Home: 0, End: 1,
      }[e.key];
      if (to === undefined) return;
      e.preventDefault();
      e.stopPropagation();
      this.moveDivider(to);
    });
  }

  // ---- the section line over the map -----------------------------------------------------------

  figure() {
    for (const doc of window.Bokeh?.documents ?? []) {
      const found = doc.get_model_by_name("map-figure");
      if (found) return found;
    }
    return null;
  }

  followMap() {
    const figure = this.figure();
    if (!figure) return;
    for (const range of [figure.x_range, figure.y_range]) range.change.connect(() => this.overlay());
    const map = document.getElementById("map");
    new ResizeObserver(() => {
      this.overlay();
      this.quiet(map);
      this.quiet(document.getElementById("twin"));
    }).observe(map);
    this.quiet(map);
  }

  // The canvas is no stop for the Tab key: the map itself is one, with a name and keys that do something.
  quiet(node) {
    for (const element of node.querySelectorAll("*")) {
      if (element.shadowRoot) this.quiet(element.shadowRoot);
      if (element.tabIndex >= 0 && !element.matches("button, [role=slider]")) element.tabIndex = -1;
    }
  }

  // Pixels of a local point on the map, and back.
  toPixels([x, y]) {
    const { x_range, y_range } = this.figure();
    const map = document.getElementById("map");
    return [
      ((x - x_range.start) / (x_range.end - x_range.start)) * map.clientWidth,
      (1 - (y - y_range.start) / (y_range.end - y_range.start)) * map.clientHeight,
    ];
  }

  toPlace([px, py]) {
    const { x_range, y_range } = this.figure();
    const map = document.getElementById("map");
    return [
      x_range.start + (px / map.clientWidth) * (x_range.end - x_range.start),
      y_range.start + (1 - py / map.clientHeight) * (y_range.end - y_range.start),
    ];
  }

  // Marks that are buttons stand at their place on the map.
  places() {
    for (const mark of document.querySelectorAll("#map [data-at]")) {
      const [px, py] = this.toPixels(mark.dataset.at.split(",").map(Number));
      mark.style.transform = `translate(${px}px, ${py}px)`;
    }
  }

  overlay() {
    const layer = document.getElementById("over");
    if (!layer || !this.figure()) return;
    this.places();
    const ends = this.ends ?? this.state.ends;
    layer.hidden = !ends;
    if (!ends) return;
    const [left, right] = ends.map((end) => this.toPixels(end));
    for (const line of layer.querySelectorAll("line")) {
      line.setAttribute("x1", left[0]);
      line.setAttribute("y1", left[1]);
      line.setAttribute("x2", right[0]);
      line.setAttribute("y2", right[1]);
    }
    for (const [button, at] of [["end-left", left], ["end-right", right]]) {
      document.getElementById(button).style.transform = `translate(${at[0]}px, ${at[1]}px)`;
    }
  }

  listenEnds() {
    for (const [id, which] of [["end-left", 0], ["end-right", 1]]) {
      const button = document.getElementById(id);
      if (!button) continue;
      button.addEventListener("pointerdown", (e) => {
        e.preventDefault();
        button.focus();
        button.setPointerCapture(e.pointerId);
        this.dragged = which;
      });
      button.addEventListener("pointermove", (e) => {
        if (this.dragged !== which) return;
        const box = document.getElementById("map").getBoundingClientRect();
        this.moveEnd(which, this.toPlace([e.clientX - box.left, e.clientY - box.top]));
      });
      const letGo = () => {
        if (this.dragged === which) this.dragged = undefined;
      };
      button.addEventListener("pointerup", letGo);
      button.addEventListener("pointercancel", letGo);
      button.addEventListener("keydown", (e) => {
        const step = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, -1], ArrowDown: [0, 1] }[e.key];
        if (!step) return;
        e.preventDefault();
        const far = e.shiftKey ? 20 : 4;
        const [x, y] = this.toPixels((this.ends ?? this.state.ends)[which]);
        this.moveEnd(which, this.toPlace([x + far * step[0], y + far * step[1]]));
      });
    }
  }

  moveEnd(which, place) {
    const ends = [...(this.ends ?? this.state.ends)];
    ends[which] = place;
    this.ends = ends;
    this.overlay();
    this.sweep("section", { ends });
    clearTimeout(this.settle);
    this.settle = setTimeout(() => (this.ends = undefined), 1500);
  }
}
