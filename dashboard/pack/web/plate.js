// The map: water painted from its triangles, and over it waterline, structures, frame and scale; sharp at any scale.
"use strict";

const PLATE = (() => {
  // A view's place on a canvas: `x`, `y` its centre and `width` its width in m, `w` and `h` its size in px.
  class View {
    constructor(x, y, width, w, h) {
      Object.assign(this, { x, y, width, w, h, step: width / w });
      this.west = x - width / 2;
      this.north = y + (h * this.step) / 2;
    }

    get box() { return [this.west, this.north - this.h * this.step, this.west + this.width, this.north]; }

    px(x) { return (x - this.west) / this.step; }

    py(y) { return (this.north - y) / this.step; }

    at(px, py) { return [this.west + px * this.step, this.north - py * this.step]; }
  }

  // What colours and sizes the page has now; drawings take them from its custom properties.
  function looks() {
    const style = getComputedStyle(document.documentElement), of = (name) => style.getPropertyValue(`--${name}`).trim();
    const label = document.createElement("span");
    label.style.fontSize = "var(--label)";
    document.body.append(label);
    const size = parseFloat(getComputedStyle(label).fontSize);
    label.remove();
    return {
      paper: of("paper"), ink: of("ink"), ink2: of("ink2"), signal: of("signal"), onSignal: of("on-signal"), ground: of("ground"),
      line: parseFloat(of("stroke")) || 1, label: size, sans: of("atkinson"), serif: of("literata"),
    };
  }

  // "#rrggbb" colours as the pixels of an image.
  const pixelsOf = (colours) => Uint32Array.from(colours, (c) =>
    c.length > 7 ? 0 : (255 << 24 | parseInt(c.slice(5, 7), 16) << 16 | parseInt(c.slice(3, 5), 16) << 8 | parseInt(c.slice(1, 3), 16)) >>> 0);

  function path(ctx, view, points, closed) {
    points.forEach(([x, y], i) => (i ? ctx.lineTo(view.px(x), view.py(y)) : ctx.moveTo(view.px(x), view.py(y))));
    if (closed) ctx.closePath();
  }

  function lines(ctx, view, mesh, field, look) {
    ctx.beginPath();
    WATER.tubeLines(mesh, field, view.box, (x1, y1, x2, y2) => {
      ctx.moveTo(view.px(x1), view.py(y1));
      ctx.lineTo(view.px(x2), view.py(y2));
    });
    ctx.globalAlpha = 0.34;
    ctx.lineWidth = 0.6 * look.line;
    ctx.strokeStyle = look.ink;
    ctx.stroke();
    ctx.globalAlpha = 1;
  }

  // The waterline with ticks across it on the dry side; its lines have the water on their left.
  function shore(ctx, view, item, look) {
    const { shore_x: xs, shore_y: ys, shore_n: counts } = item.arrays, worth = item.content.scale.shore;
    const [west, south, east, north] = view.box, edge = 12 * view.step, line = new Path2D(), ticks = new Path2D();
    let at = 0;
    for (const count of counts) {
      let until = 0, long = true, open = false, x1 = xs[at] * worth, y1 = ys[at] * worth;
      for (let i = at + 1; i < at + count; i += 1) {
        const x2 = xs[i] * worth, y2 = ys[i] * worth;
        // Points closer than 3 px only roughen the line and turn its ticks about.
        if (i < at + count - 1 && Math.abs(x2 - x1) + Math.abs(y2 - y1) < 3 * view.step) continue;
        const away = Math.max(x1, x2) < west - edge || Math.min(x1, x2) > east + edge || Math.max(y1, y2) < south - edge || Math.min(y1, y2) > north + edge;
        const ax = view.px(x1), ay = view.py(y1), bx = view.px(x2), by = view.py(y2), length = Math.hypot(bx - ax, by - ay);
        [x1, y1] = [x2, y2];
        if (away) {
          open = false;
          continue;
        }
        if (!open) line.moveTo(ax, ay);
        line.lineTo(bx, by);
        open = true;
        if (!(length > 0)) continue;
        const ux = (bx - ax) / length, uy = (by - ay) / length;
        for (; until <= length; until += 5 * look.line, long = !long) {
          const reach = (long ? 9 : 4.5) * look.line, x = ax + until * ux, y = ay + until * uy;
          ticks.moveTo(x, y);
          ticks.lineTo(x - reach * uy, y + reach * ux);
        }
        until -= length;
      }
      at += count;
    }
    ctx.strokeStyle = look.ink;
    ctx.lineWidth = look.line;
    ctx.globalAlpha = 0.62;
    ctx.stroke(ticks);
    ctx.globalAlpha = 1;
    ctx.lineWidth = 1.5 * look.line;
    ctx.stroke(line);
  }

  function structures(ctx, view, listed, look) {
    for (const { kind, solid, closed, rings } of listed) {
      ctx.beginPath();
      for (const ring of rings) path(ctx, view, ring, closed);
      if (closed && solid) {
        ctx.fillStyle = look.ink;
        ctx.fill("evenodd");
        continue;
      }
      ctx.strokeStyle = look.ink;
      ctx.lineWidth = (kind === "weir" && !closed ? 2 : 1.2) * look.line;
      ctx.setLineDash(kind === "deck" ? [14, 6] : closed || kind === "culvert" ? [4, 3] : []);
      ctx.stroke();
      ctx.setLineDash([]);
    }
  }

  // A line of text on its paper casing.
  function words(ctx, look, text, x, y, { italic = false, size = look.label, align = "left" } = {}) {
    ctx.font = `${italic ? "italic " : ""}${size}px ${italic ? look.serif : look.sans}`;
    ctx.textAlign = align;
    ctx.textBaseline = "middle";
    ctx.lineJoin = "round";
    ctx.lineWidth = 4;
    ctx.strokeStyle = look.paper;
    ctx.strokeText(text, x, y);
    ctx.fillStyle = look.ink;
    ctx.fillText(text, x, y);
  }

  // "flow" with an arrow, where the centre line comes into view and nothing of `taken` (boxes in px) stands.
  function flow(ctx, view, centre, taken, look) {
    const inside = centre.map(([x, y]) => [view.px(x), view.py(y)]);
    for (let i = 1; i < inside.length; i += 1) {
      const [[ax, ay], [bx, by]] = [inside[i - 1], inside[i]], length = Math.hypot(bx - ax, by - ay) || 1;
      for (let s = 0; s < length; s += 12) {
        const x = ax + (s / length) * (bx - ax), y = ay + (s / length) * (by - ay);
        if (x < 60 || y < 60 || x > view.w - 60 || y > view.h - 60) continue;
        if (taken.some((b) => x > b[0] - 50 && x < b[2] + 50 && y > b[1] - 50 && y < b[3] + 50)) continue;
        let angle = Math.atan2(by - ay, bx - ax);
        const back = Math.abs(angle) > Math.PI / 2;
        ctx.save();
        ctx.translate(x, y);
        ctx.rotate(back ? angle + Math.PI : angle);
        words(ctx, look, "flow", 0, 0, { italic: true, align: "center", size: 1.15 * look.label });
        const way = back ? -1 : 1;
        ctx.beginPath();
        for (const [px, py] of [[22, 0], [46, 0], [39, -4], [46, 0], [39, 4]]) ctx.lineTo(way * px, py);
        ctx.strokeStyle = look.ink;
        ctx.lineWidth = 1.2 * look.line;
        ctx.stroke();
        ctx.restore();
        return;
      }
    }
  }

  const round = (target) => {
    const power = 10 ** Math.floor(Math.log10(target));
    return Math.max(...[1, 2, 5].filter((s) => s * power <= target * (1 + 1e-9))) * power;
  };

  // The plate's frame with ticks of a round length inward, and the scale bar; `unit` {factor, label} of lengths.
  function frame(ctx, view, look, unit) {
    const every = round((90 * view.step * unit.factor) / 5) / unit.factor, inset = 0.75 * look.line;
    ctx.strokeStyle = look.ink;
    ctx.lineWidth = 1.5 * look.line;
    ctx.strokeRect(inset, inset, view.w - 2 * inset, view.h - 2 * inset);
    ctx.beginPath();
    const [west, south, east, north] = view.box;
    for (let k = Math.ceil(west / every); k * every < east; k += 1) {
      const at = view.px(k * every), reach = k % 5 ? 4 : 8;
      ctx.moveTo(at, 0);
      ctx.lineTo(at, reach);
      ctx.moveTo(at, view.h);
      ctx.lineTo(at, view.h - reach);
    }
    for (let k = Math.ceil(south / every); k * every < north; k += 1) {
      const at = view.py(k * every), reach = k % 5 ? 4 : 8;
      ctx.moveTo(0, at);
      ctx.lineTo(reach, at);
      ctx.moveTo(view.w, at);
      ctx.lineTo(view.w - reach, at);
    }
    ctx.lineWidth = look.line;
    ctx.stroke();
    scale(ctx, view, look, unit);
  }

  function scale(ctx, view, look, unit) {
    const length = round(120 * view.step * unit.factor), px = length / unit.factor / view.step, high = 0.4 * look.label;
    const x = view.w - px - 26, y = view.h - 18 - high;
    ctx.fillStyle = look.paper;
    ctx.globalAlpha = 0.82;
    ctx.fillRect(x - 8, y - 1.5 * look.label, px + 26, 1.5 * look.label + high + 8);
    ctx.globalAlpha = 1;
    ctx.fillRect(x, y, px, high);
    ctx.fillStyle = look.ink;
    ctx.fillRect(x, y, px / 2, high);
    ctx.strokeStyle = look.ink;
    ctx.lineWidth = 1;
    ctx.strokeRect(x, y, px, high);
    words(ctx, look, "0", x, y - 0.7 * look.label);
    words(ctx, look, `${length} ${unit.label}`, x + px + 14, y - 0.7 * look.label, { align: "right" });
  }

  return { View, looks, pixelsOf, path, lines, shore, structures, words, flow, frame };
})();
