// The page: one state (run, frame, eddy, section, view, parcels), everything drawn from it, and what the reader does to it.
"use strict";

const PAGE = (() => {
  const $ = (id) => document.getElementById(id), root = document.documentElement;
  const state = { run: 0, index: 0, subject: "", section: 0, x: 0, y: 0, width: 100, parcels: [], stop: -1 };
  const narrow = matchMedia("(max-width: 639px)");
  let pack = null, head = null, mesh = null, item = null, field = null, look = null, palette = null, image = null, asked = 0;
  const listeners = [];

  const key = (index) => `${pack.runs[state.run].key}-f${index}`;
  const seconds = () => head.seconds[state.index];
  const size = () => [$("map").clientWidth, $("map").clientHeight];
  const view = () => new PLATE.View(state.x, state.y, state.width, ...size());
  const zone = () => item.content.zones.find((z) => z.id === state.subject);

  // ---- runs and frames ----

  async function open(run, index, subject = "") {
    state.run = run;
    const found = await PACK.get(pack.runs[run].key);
    head = found.content;
    mesh = new WATER.Mesh(found.arrays);
    state.parcels = [];
    state.section = 0;
    $("sections").replaceChildren(...head.sections.map((s, i) => new Option(s.name, i)));
    $("key").innerHTML = head.key;
    $("also").innerHTML = head.also;
    const last = head.seconds.length - 1;
    $("time").max = last;
    for (const id of ["time", "run-on"]) $(id).hidden = last === 0;
    ribbon();
    await show(index ?? head.opening, subject);
    ahead();
  }

  async function show(index, subject = state.subject) {
    const turn = ++asked;
    const found = await PACK.get(key(index));
    if (turn !== asked) return;
    const fresh = field === null || found !== item;
    state.index = index;
    item = found;
    field = item.field ??= new WATER.Field(item, head.wet);
    state.subject = item.content.zones.some((z) => z.id === subject) ? subject : item.content.subject;
    if (fresh) say();
    else sentence();
    draw();
    root.dataset.frame = index;
  }

  // The other frames, nearest first, while nobody waits for anything.
  async function ahead() {
    const run = state.run, order = head.seconds.map((_, i) => i).sort((a, b) => Math.abs(a - state.index) - Math.abs(b - state.index));
    for (const i of order) {
      if (run !== state.run) return;
      await PACK.get(key(i));
    }
    root.dataset.loaded = pack.runs[run].key;
  }

  const allFrom = async (index) => Promise.all(head.seconds.map((_, i) => (i < index - 1 ? null : PACK.get(key(i)))));

  // ---- words and drawings that were made with the pack ----

  const way = () => (root.dataset.view === "hall" ? "hall" : narrow.matches ? "narrow" : "wide");
  const said = () => item.content.said[way()];

  function sentence() {
    const { sentences } = said();
    $("answer").innerHTML = sentences[state.subject] ?? sentences[""] ?? "";
    for (const row of document.querySelectorAll("#table tr[data-value]")) {
      const mine = row.dataset.value === state.subject;
      row.classList.toggle("subject", mine);
      row.querySelector("button").setAttribute("aria-pressed", mine);
    }
  }

  function say() {
    const focused = document.activeElement?.dataset?.key;
    $("table").innerHTML = said().table;
    sentence();
    section();
    $("alternative").innerHTML = item.content.alternative;
    const { factor, label } = pack.flow, { tube } = item.content;
    $("tubes").textContent = tube > 0 ? `Speed in tubes of ${Number((tube * factor).toPrecision(2))}\u00a0${label} each: narrow is fast.` : "Speed of the water; no tubes in this frame.";
    $("map-picture").setAttribute("aria-label", $("alternative").textContent);
    $("time").value = state.index;
    $("time").setAttribute("aria-valuetext", head.moments[state.index]);
    cursor();
    if (focused) document.querySelector(`[data-key="${CSS.escape(focused)}"]`)?.focus();
  }

  function section() {
    $("section").innerHTML = said().sections[state.section] ?? "";
  }

  const strip = () => head.ribbon[way()];

  function ribbon() {
    $("ribbon-picture").innerHTML = strip().svg;
  }

  function cursor() {
    const place = $("ribbon-picture").querySelector("[data-cursor]");
    if (place) place.outerHTML = said().cursor;
  }

  // ---- the map ----

  // After the way of looking has changed: other sizes, colours, drawings and words.
  function dressed() {
    look = PLATE.looks();
    const night = root.dataset.mode === "night", hall = root.dataset.view === "hall";
    palette = PLATE.pixelsOf(pack.palettes[night ? "night" : hall ? "hall" : "day"]);
    $("cautions").innerHTML = pack.cautions[way()];
    if (!item) return;
    ribbon();
    say();
    draw();
  }

  function draw() {
    const [w, h] = size(), canvas = $("map-picture"), ratio = Math.min(devicePixelRatio || 1, 2);
    if (!item || w < 2 || h < 2) return;
    const columns = Math.round(w * ratio), rows = Math.round(h * ratio), v = view();
    const ctx = canvas.getContext("2d", { willReadFrequently: true });
    if (canvas.width !== columns || canvas.height !== rows || image === null) {
      Object.assign(canvas, { width: columns, height: rows });
      image = ctx.createImageData(columns, rows);
    }
    const grid = { west: v.west, north: v.north, step: v.width / columns, columns, rows };
    WATER.paint(new Uint32Array(image.data.buffer), grid, mesh, field, head.top, palette);
    ctx.setTransform(1, 0, 0, 1, 0, 0);
    ctx.putImageData(image, 0, 0);
    ctx.setTransform(ratio, 0, 0, ratio, 0, 0);
    marks(ctx, v);
    for (const told of listeners) told();
  }

  function marks(ctx, v) {
    PLATE.lines(ctx, v, mesh, field, look);
    PLATE.shore(ctx, v, item, look);
    PLATE.structures(ctx, v, head.structures, look);
    const { zones } = item.content, chosen = zone();
    for (const z of zones) if (z !== chosen) MARKS.zone(ctx, v, z, false, look);
    if (chosen) MARKS.zone(ctx, v, chosen, true, look);
    const line = head.sections[state.section], taken = line ? MARKS.section(ctx, v, line.ends, look) : [];
    place(v, line);
    const { offsetLeft: left, offsetTop: top, offsetWidth: wide, offsetHeight: high } = $("key");
    taken.push([left, top, left + wide, top + high], [v.w - 44, 0, v.w, 64], [v.w - 190, v.h - 44, v.w, v.h]); // key, north, scale
    names(ctx, v, taken);
    const hidden = MARKS.tags(ctx, v, zones, state.subject, taken, look);
    $("hidden").textContent = hidden ? `${hidden} more ${hidden === 1 ? "eddy finds" : "eddies find"} no room for a name here.` : "";
    for (const track of state.parcels) MARKS.parcel(ctx, v, track, head.seconds.length > 1 ? seconds() : Infinity, look);
    for (const pin of QUERIES.pins(pack.runs[state.run].id, head.corner)) MARKS.query(ctx, v, pin, look);
    PLATE.flow(ctx, v, head.centre, taken, look);
    PLATE.frame(ctx, v, look, pack.length);
  }

  // The key takes the first corner in which it covers nothing of the section.
  function place(v, line) {
    const box = $("key"), [w, h] = [box.offsetWidth + 14, box.offsetHeight + 14], room = 24 * look.line;
    const corners = { nw: [0, 0], sw: [0, v.h - h], ne: [v.w - w - 44, 0] };
    const covers = ([left, top]) => {
      if (!line) return false;
      const [[ax, ay], [bx, by]] = line.ends.map(([x, y]) => [v.px(x), v.py(y)]);
      for (let k = 0; k <= 40; k += 1) {
        const x = ax + (k / 40) * (bx - ax), y = ay + (k / 40) * (by - ay);
        if (x > left - room && x < left + w + room && y > top - room && y < top + h + room) return true;
      }
      return false;
    };
    root.dataset.key = Object.keys(corners).find((name) => !covers(corners[name])) ?? "nw";
  }

  // Names of structures, where they stand clear of what was placed before.
  function names(ctx, v, taken) {
    for (const { name, rings } of head.structures) {
      const points = rings.flat(), x = Math.max(...points.map((p) => v.px(p[0]))) + 8;
      const y = points.reduce((sum, p) => sum + v.py(p[1]), 0) / points.length;
      ctx.font = `${look.label}px ${look.sans}`;
      const box = [x, y - look.label * 0.7, x + ctx.measureText(name).width, y + look.label * 0.7];
      if (box[0] < 4 || box[2] > v.w - 4 || box[1] < 4 || box[3] > v.h - 4 || taken.some((b) => box[0] < b[2] && b[0] < box[2] && box[1] < b[3] && b[1] < box[3])) continue;
      taken.push(box);
      PLATE.words(ctx, look, name, x, y);
    }
  }

  function lookAt(x, y, width) {
    const most = 1.6 * Math.max(head.size[0], (head.size[1] * size()[0]) / size()[1]);
    Object.assign(state, {
      x: Math.min(Math.max(x, 0), head.size[0]), y: Math.min(Math.max(y, 0), head.size[1]), width: Math.min(Math.max(width, 2), most),
    });
    draw();
  }

  function whole() {
    const [w, h] = size();
    lookAt(head.size[0] / 2, head.size[1] / 2, 1.06 * Math.max(head.size[0], (head.size[1] * w) / h));
  }

  function boxOf(points) {
    const xs = points.map((p) => p[0]), ys = points.map((p) => p[1]);
    return points.length ? [Math.min(...xs), Math.min(...ys), Math.max(...xs), Math.max(...ys)] : null;
  }

  // The subject and the section through it, with room round them.
  function near() {
    const [w, h] = size(), eddy = boxOf(zone()?.rings.flat() ?? []), line = boxOf(head.sections[state.section]?.ends ?? []);
    if (!eddy && !line) return whole();
    const apart = eddy && line && (line[0] > eddy[2] || line[2] < eddy[0] || line[1] > eddy[3] || line[3] < eddy[1]);
    const boxes = apart ? [eddy] : [eddy, line].filter(Boolean);
    const [west, south] = [0, 1].map((k) => Math.min(...boxes.map((b) => b[k]))), [east, north] = [2, 3].map((k) => Math.max(...boxes.map((b) => b[k])));
    return lookAt((west + east) / 2, (south + north) / 2, Math.max(1.5 * (east - west), (1.5 * (north - south) * w) / h, 40));
  }

  // Change the scale about a point of the map, px; it stays where it is.
  function zoom(factor, px = size()[0] / 2, py = size()[1] / 2) {
    const [x, y] = view().at(px, py);
    lookAt(x + (state.x - x) * factor, y + (state.y - y) * factor, state.width * factor);
  }

  // ---- parcels ----

  // Let a parcel go at a point (m from the corner) now; gives its track, null off the water.
  async function letGo(x, y) {
    const begin = seconds(), steady = head.seconds.length === 1, end = steady ? begin + 1800 : head.seconds.at(-1);
    if (!steady && begin >= end) {
      $("parcel").textContent = "This is the last frame: move to an earlier one and let a parcel go there.";
      return null;
    }
    const found = await allFrom(state.index);
    const fields = found.map((f) => f && (f.field ??= new WATER.Field(f, head.wet)));
    const t = mesh.find(x, y), w = [0, 0, 0];
    if (t >= 0) mesh.weights(t, x, y, w);
    const depth = t < 0 ? 0 : [0, 1, 2].reduce((sum, k) => sum + w[k] * field.depth(mesh.triangles[3 * t + k]), 0);
    if (depth <= head.wet) {
      $("parcel").textContent = "There is no water there in this frame; choose a place on the water.";
      return null;
    }
    const track = new DRIFT.Tracer(mesh, fields, head.seconds).trace(x, y, begin, end, Math.max(0.25, (end - begin) / 1200));
    state.parcels.push(track);
    $("clear").disabled = false;
    draw();
    return track;
  }

  // What became of the parcels by now, in words.
  function parcelWords() {
    const { parcels } = state, steady = head.seconds.length === 1;
    if (!parcels.length) return;
    const now = steady ? Infinity : seconds(), track = parcels.at(-1);
    let at = 0, way = 0;
    for (let i = 1; i < track.seconds.length && track.seconds[i] <= now + 1e-6; i += 1) {
      way += Math.hypot(track.x[i] - track.x[i - 1], track.y[i] - track.y[i - 1]);
      at = i;
    }
    const after = track.seconds[at] - track.seconds[0], { factor, label } = pack.length;
    const gone = track.states[at] === "left" ? "it has left the model" : track.states[at] === "aground" ? "it lies aground" : "it is afloat";
    const when = now < track.seconds[0] - 1e-6 ? "not let go yet at this time" :
      `${time(after)} after it was let go, ${Number((way * factor).toPrecision(3))} ${label} along its path, ${gone}`;
    $("parcel").textContent = `${parcels.length > 1 ? `The last of ${parcels.length} parcels` : "The parcel"}: ${when}${steady ? ", if this flow stayed as it is" : ""}.`;
  }

  const time = (s) => (s >= 60 ? `${Math.floor(Math.round(s) / 60)} min ${Math.round(s) % 60} s` : `${Math.round(s)} s`);

  // ---- saved views ----

  async function stop(number) {
    const saved = pack.stops[number];
    state.stop = number;
    const run = Math.max(0, pack.runs.findIndex((r) => r.id === saved.run));
    if (run !== state.run) {
      $("run").value = run;
      await open(run, undefined, saved.subject);
    }
    const nearest = saved.seconds === null ? head.opening :
      head.seconds.reduce((best, s, i) => (Math.abs(s - saved.seconds) < Math.abs(head.seconds[best] - saved.seconds) ? i : best), 0);
    await show(nearest, saved.subject);
    if (saved.view) lookAt(saved.view[0] - head.corner[0], saved.view[1] - head.corner[1], saved.view[2]);
    else near();
    $("stop-words").textContent = saved.sentence;
    $("stop-number").textContent = `Stop ${number + 1} of ${pack.stops.length}`;
    $("stop-before").disabled = number === 0;
    $("stop-next").disabled = number === pack.stops.length - 1;
  }

  async function begin() {
    pack = (await PACK.get("pack")).content;
    dressed();
    QUERIES.begin(pack, () => ({ run: pack.runs[state.run].id, seconds: head ? seconds() : null, x: state.x + head.corner[0], y: state.y + head.corner[1] }), draw);
    listeners.push(parcelWords);
    $("stops").hidden = pack.stops.length === 0;
    $("stop-number").textContent = `${pack.stops.length} saved ${pack.stops.length === 1 ? "view" : "views"}`;
    await open(0);
    near();
    root.dataset.ready = "yes";
  }

  return {
    $, root, state, begin, open, show, draw, dressed, section, zoom, near, whole, lookAt, letGo, stop, view, size, narrow,
    get pack() { return pack; }, get head() { return head; }, get mesh() { return mesh; }, get item() { return item; }, places: () => strip(),
  };
})();
