// What the sentence speaks of, on the map: eddies with their tags, the section line, queries and parcels.
"use strict";

const MARKS = (() => {
  // Paper wash, hatch by the sense of rotation, outline, two streamlines inside and the turning mark.
  function zone(ctx, view, z, subject, look) {
    const colour = subject ? look.signal : look.ink, area = new Path2D();
    let [left, top, right, bottom] = [Infinity, Infinity, -Infinity, -Infinity];
    for (const ring of z.rings) {
      PLATE.path(area, view, ring, true);
      for (const [x, y] of ring) {
        left = Math.min(left, view.px(x));
        right = Math.max(right, view.px(x));
        top = Math.min(top, view.py(y));
        bottom = Math.max(bottom, view.py(y));
      }
    }
    if (right < 0 || left > view.w || bottom < 0 || top > view.h) return;
    ctx.save();
    if (!z.travelling) {
      ctx.globalAlpha = 0.62;
      ctx.fillStyle = look.paper;
      ctx.fill(area, "evenodd");
      ctx.globalAlpha = 1;
      hatch(ctx, area, [Math.max(left, 0), Math.max(top, 0), Math.min(right, view.w), Math.min(bottom, view.h)], z.rotation === "clockwise", colour, look);
    }
    ctx.strokeStyle = colour;
    ctx.setLineDash(z.travelling ? [1, 4] : []);
    ctx.lineWidth = (subject ? 2.2 : 1.3) * look.line;
    ctx.stroke(area);
    ctx.setLineDash([]);
    ctx.lineWidth = 0.8 * look.line;
    for (const line of z.inner) {
      ctx.beginPath();
      PLATE.path(ctx, view, line, false);
      ctx.stroke();
    }
    const room = Math.min(right - left, bottom - top);
    if (room > 24) turning(ctx, view.px(z.centre[0]), view.py(z.centre[1]), Math.min(10, room / 4) * look.line, z.rotation, colour, look);
    for (const [at, filled] of [[z.leaves, true], [z.returns, false]]) if (at && room > 24) triangle(ctx, view.px(at[0]), view.py(at[1]), filled, look);
    ctx.restore();
  }

  function hatch(ctx, area, [left, top, right, bottom], rising, colour, look) {
    ctx.save();
    ctx.clip(area, "evenodd");
    ctx.beginPath();
    const high = bottom - top, gap = 11 * look.line, from = Math.floor((left - high) / gap) * gap;
    for (let x = from; x < right; x += gap) {
      ctx.moveTo(x, rising ? bottom : top);
      ctx.lineTo(x + high, rising ? top : bottom);
    }
    ctx.strokeStyle = colour;
    ctx.lineWidth = look.line;
    ctx.globalAlpha = 0.75;
    ctx.stroke();
    ctx.restore();
  }

  // An open circle that turns, with a head of two strokes at its end.
  function turning(ctx, x, y, radius, rotation, colour, look) {
    const sense = rotation === "anticlockwise" ? -1 : 1, begin = -Math.PI / 2 + sense * 0.7, end = -Math.PI / 2 + sense * 5.76;
    const tip = [x + radius * Math.cos(end), y + radius * Math.sin(end)], way = end + (sense * Math.PI) / 2, head = 0.62 * radius;
    ctx.beginPath();
    ctx.arc(x, y, radius, begin, end, sense < 0);
    for (const turn of [0.64, -0.64]) {
      ctx.moveTo(tip[0] - head * Math.cos(way + turn), tip[1] - head * Math.sin(way + turn));
      ctx.lineTo(...tip);
    }
    ctx.strokeStyle = look.paper;
    ctx.lineWidth = 4.5 * look.line;
    ctx.stroke();
    ctx.strokeStyle = colour;
    ctx.lineWidth = 1.8 * look.line;
    ctx.stroke();
  }

  function triangle(ctx, x, y, filled, look) {
    ctx.beginPath();
    for (const [dx, dy] of [[0, -6], [5.5, 4.5], [-5.5, 4.5]]) ctx.lineTo(x + dx * look.line, y + dy * look.line);
    ctx.closePath();
    ctx.fillStyle = filled ? look.ink : look.paper;
    ctx.strokeStyle = look.ink;
    ctx.lineWidth = 1.2 * look.line;
    ctx.fill();
    ctx.stroke();
  }

  const meets = (a, b) => a[0] < b[2] && b[0] < a[2] && a[1] < b[3] && b[1] < a[3];

  // Tags beside their eddies, the subject's first; those without room are left out. Gives how many were.
  function tags(ctx, view, zones, subject, taken, look) {
    ctx.font = `650 ${look.label}px ${look.sans}`;
    let hidden = 0;
    const first = [...zones].sort((a, b) => (b.id === subject) - (a.id === subject));
    for (const z of first) {
      const x = view.px(z.centre[0]), y = view.py(z.centre[1]);
      if (x < 0 || y < 0 || x > view.w || y > view.h) continue;
      const w = ctx.measureText(z.id).width + 10, h = 1.5 * look.label;
      const place = [[0, -1], [1, 0], [-1, 0], [0, 1], [1, -1], [-1, -1], [1, 1], [-1, 1]].flatMap(([dx, dy]) =>
        [24, 44].map((d) => [x + dx * (d + w / 2) - w / 2, y + dy * (d + h / 2) - h / 2])).map(([l, t]) => [l, t, l + w, t + h])
        .find((box) => box[0] > 4 && box[1] > 4 && box[2] < view.w - 4 && box[3] < view.h - 4 && !taken.some((b) => meets(b, box)));
      if (!place) {
        hidden += 1;
        continue;
      }
      taken.push(place);
      tag(ctx, place, z, z.id === subject, x, y, look);
    }
    return hidden;
  }

  function tag(ctx, [left, top, right, bottom], z, subject, x, y, look) {
    const colour = subject ? look.signal : look.ink, ex = Math.min(Math.max(x, left), right), ey = Math.min(Math.max(y, top), bottom);
    const length = Math.hypot(x - ex, y - ey);
    if (length > 16) {
      ctx.beginPath();
      ctx.moveTo(ex, ey);
      ctx.lineTo(x + (14 * (ex - x)) / length, y + (14 * (ey - y)) / length);
      ctx.strokeStyle = colour;
      ctx.lineWidth = look.line;
      ctx.stroke();
    }
    ctx.beginPath();
    ctx.roundRect(left, top, right - left, bottom - top, 2);
    ctx.fillStyle = subject ? look.signal : look.paper;
    ctx.fill();
    ctx.setLineDash(z.coarse ? [3, 2] : []);
    ctx.strokeStyle = colour;
    ctx.lineWidth = look.line;
    ctx.stroke();
    ctx.setLineDash([]);
    ctx.font = `650 ${look.label}px ${look.sans}`;
    ctx.textAlign = "center";
    ctx.textBaseline = "middle";
    ctx.fillStyle = subject ? look.onSignal : look.ink;
    ctx.fillText(z.id, (left + right) / 2, (top + bottom) / 2 + 1);
  }

  function section(ctx, view, ends, look) {
    const [[ax, ay], [bx, by]] = ends.map(([x, y]) => [view.px(x), view.py(y)]);
    const boxes = [];
    for (const [colour, width, dash] of [[look.paper, 4.6, []], [look.ink, 1.8, [12, 4, 2, 4]]]) {
      ctx.beginPath();
      ctx.moveTo(ax, ay);
      ctx.lineTo(bx, by);
      ctx.strokeStyle = colour;
      ctx.lineWidth = width * look.line;
      ctx.setLineDash(dash);
      ctx.stroke();
    }
    ctx.setLineDash([]);
    for (const [x, y, letter] of [[ax, ay, "L"], [bx, by, "R"]]) {
      const r = 0.85 * look.label;
      ctx.beginPath();
      ctx.arc(x, y, r, 0, 2 * Math.PI);
      ctx.fillStyle = look.paper;
      ctx.fill();
      ctx.strokeStyle = look.ink;
      ctx.lineWidth = 1.5 * look.line;
      ctx.stroke();
      ctx.font = `650 ${look.label}px ${look.sans}`;
      ctx.textAlign = "center";
      ctx.textBaseline = "middle";
      ctx.fillStyle = look.ink;
      ctx.fillText(letter, x, y + 1);
      boxes.push([x - r, y - r, x + r, y + r]);
    }
    return boxes;
  }

  // A parcel's path up to a moment, with a tick every minute, and the parcel there.
  function parcel(ctx, view, track, moment, look) {
    let at = 0;
    ctx.beginPath();
    for (let i = 0; i < track.seconds.length && track.seconds[i] <= moment + 1e-6; i += 1) {
      ctx.lineTo(view.px(track.x[i]), view.py(track.y[i]));
      at = i;
    }
    const x = view.px(track.x[at]), y = view.py(track.y[at]);
    for (const [colour, width] of [[look.paper, 4.4], [look.ink, 1.6]]) {
      ctx.strokeStyle = colour;
      ctx.lineWidth = width * look.line;
      ctx.stroke();
    }
    ctx.beginPath();
    for (let i = 1; i < at; i += 1) {
      if (Math.floor((track.seconds[i] - track.seconds[0]) / 60) === Math.floor((track.seconds[i - 1] - track.seconds[0]) / 60)) continue;
      const dx = view.px(track.x[i + 1]) - view.px(track.x[i - 1]), dy = view.py(track.y[i + 1]) - view.py(track.y[i - 1]), d = Math.hypot(dx, dy) || 1;
      ctx.moveTo(view.px(track.x[i]) - (4 * dy) / d, view.py(track.y[i]) + (4 * dx) / d);
      ctx.lineTo(view.px(track.x[i]) + (4 * dy) / d, view.py(track.y[i]) - (4 * dx) / d);
    }
    ctx.lineWidth = 1.4 * look.line;
    ctx.stroke();
    ctx.beginPath();
    ctx.arc(x, y, 6 * look.line, 0, 2 * Math.PI);
    ctx.fillStyle = look.ink;
    ctx.strokeStyle = look.paper;
    ctx.lineWidth = 2.4 * look.line;
    ctx.fill();
    ctx.stroke();
  }

  // A query's pin: a paper square with its number; answered: the corner struck.
  function query(ctx, view, { x, y, number, answered }, look) {
    const side = 1.6 * look.label, left = view.px(x) - side / 2, top = view.py(y) - side / 2;
    ctx.beginPath();
    ctx.rect(left, top, side, side);
    ctx.fillStyle = look.paper;
    ctx.fill();
    if (answered) {
      ctx.moveTo(left + 0.6 * side, top);
      ctx.lineTo(left + side, top + 0.4 * side);
    }
    ctx.strokeStyle = look.ink;
    ctx.lineWidth = 1.5 * look.line;
    ctx.stroke();
    ctx.font = `650 ${look.label}px ${look.sans}`;
    ctx.textAlign = "center";
    ctx.textBaseline = "middle";
    ctx.fillStyle = look.ink;
    ctx.fillText(String(number), left + side / 2, top + side / 2 + 1);
  }

  return { zone, tags, section, parcel, query };
})();
