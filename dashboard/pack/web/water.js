// The water: a mesh of triangles, a frame's field on it, and the picture painted straight from the triangles.
"use strict";

const WATER = (() => {
  class Mesh {
    constructor({ x, y, triangles, open }) {
      Object.assign(this, { x, y, triangles });
      this.count = triangles.length / 3;
      this.open = new Uint8Array(triangles.length);
      for (const side of open) this.open[side] = 1;
      this.neighbours = neighboursOf(triangles, x.length);
      this.latest = 0;
    }

    // Weights of the corners of triangle t at a point, written into w.
    weights(t, px, py, w) {
      const { x, y, triangles } = this;
      const a = triangles[3 * t], b = triangles[3 * t + 1], c = triangles[3 * t + 2];
      const area = (x[b] - x[a]) * (y[c] - y[a]) - (y[b] - y[a]) * (x[c] - x[a]);
      w[0] = ((x[b] - px) * (y[c] - py) - (x[c] - px) * (y[b] - py)) / area;
      w[1] = ((x[c] - px) * (y[a] - py) - (x[a] - px) * (y[c] - py)) / area;
      w[2] = 1 - w[0] - w[1];
    }

    // The triangle that holds a point, -1 off the mesh; every triangle is asked, as banks and piers stop a walk.
    find(px, py) {
      const w = [0, 0, 0];
      for (let t = 0; t < this.count; t += 1) {
        this.weights(t, px, py, w);
        if (w[0] >= -1e-9 && w[1] >= -1e-9 && w[2] >= -1e-9) return t;
      }
      return -1;
    }
  }

  // Across side k (corner k to k + 1) of each triangle: the triangle there, -1 for none.
  function neighboursOf(triangles, nodes) {
    const out = new Int32Array(triangles.length).fill(-1), seen = new Map();
    for (let t = 0; t < triangles.length; t += 3) {
      for (let k = 0; k < 3; k += 1) {
        const i = triangles[t + k], j = triangles[t + ((k + 1) % 3)];
        const key = Math.min(i, j) * nodes + Math.max(i, j), other = seen.get(key);
        if (other === undefined) seen.set(key, t + k);
        else {
          out[t + k] = Math.floor(other / 3);
          out[other] = t / 3;
        }
      }
    }
    return out;
  }

  // A frame's whole numbers with what they are worth.
  class Field {
    constructor({ content, arrays }, wet) {
      const { scale, tube } = content;
      Object.assign(this, { wet, tube, h: arrays.h, qx: arrays.qx, qy: arrays.qy, psi: arrays.psi || null, domain: arrays.domain || null });
      [this.hLow, this.hStep] = scale.h;
      this.qxStep = scale.qx;
      this.qyStep = scale.qy;
      [this.psiLow, this.psiStep] = scale.psi || [0, 1];
    }

    depth(i) { return this.hLow + this.hStep * this.h[i]; }

    speed(i) {
      const h = this.depth(i);
      return h > this.wet ? Math.hypot(this.qx[i] * this.qxStep, this.qy[i] * this.qyStep) / h : 0;
    }

    // Whether triangle t is water however shallow: it carries part of the discharge.
    carries(t) { return this.domain !== null && ((this.domain[t >> 3] >> (t & 7)) & 1) === 1; }

    // Depth, speed and psi of the nodes, made when first wanted; psi is no number where no triangle of its domain is.
    on(mesh) {
      if (!this.made) {
        const n = this.h.length, depth = new Float32Array(n), speed = new Float32Array(n), psi = new Float32Array(n).fill(NaN);
        for (let i = 0; i < n; i += 1) {
          depth[i] = this.depth(i);
          speed[i] = this.speed(i);
        }
        for (let k = 0; this.psi && k < mesh.triangles.length; k += 1) {
          const i = mesh.triangles[k];
          if (this.carries(Math.floor(k / 3))) psi[i] = this.psiLow + this.psiStep * this.psi[i];
        }
        this.made = { depth, speed, psi };
      }
      return this.made;
    }
  }

  // Paint a frame into pixels (Uint32, rows from the north) of a view {west, north, step, columns, rows}.
  // `palette`: 0 no water, 1-127 even tubes from slow to fast, 128-254 odd tubes; water without psi counts as even.
  function paint(pixels, view, mesh, field, top, palette) {
    pixels.fill(0);
    const { x, y, triangles } = mesh, { depth, speed, psi } = field.on(mesh), { west, north, step, columns, rows } = view;
    const east = west + columns * step, south = north - rows * step;
    const scale = 126.999 / top, perTube = field.tube > 0 ? 1 / field.tube : 0;
    for (let t = 0; t < mesh.count; t += 1) {
      const a = triangles[3 * t], b = triangles[3 * t + 1], c = triangles[3 * t + 2];
      const xa = x[a], xb = x[b], xc = x[c], ya = y[a], yb = y[b], yc = y[c];
      const low = Math.min(ya, yb, yc), high = Math.max(ya, yb, yc);
      if (high < south || low > north || Math.min(xa, xb, xc) > east || Math.max(xa, xb, xc) < west) continue;
      const always = field.carries(t), least = always ? 0 : field.wet;
      if (depth[a] <= least && depth[b] <= least && depth[c] <= least) continue;
      const area = (xb - xa) * (yc - ya) - (yb - ya) * (xc - xa);
      // What each value grows by from pixel to pixel along a row.
      const ga = ((yb - yc) / area) * step, gb = ((yc - ya) / area) * step;
      const first = Math.max(0, Math.ceil((north - high) / step - 0.5)), last = Math.min(rows - 1, Math.ceil((north - low) / step - 0.5) - 1);
      for (let r = first; r <= last; r += 1) {
        const py = north - (r + 0.5) * step;
        let left = Infinity, right = -Infinity;
        for (let k = 0; k < 3; k += 1) { // where the row enters and leaves the triangle
          const i = k === 0 ? a : k === 1 ? b : c, j = k === 0 ? b : k === 1 ? c : a;
          if ((y[i] <= py) === (y[j] <= py)) continue;
          const at = x[i] + ((py - y[i]) / (y[j] - y[i])) * (x[j] - x[i]);
          if (at < left) left = at;
          if (at > right) right = at;
        }
        const begin = Math.max(0, Math.ceil((left - west) / step - 0.5)), end = Math.min(columns, Math.ceil((right - west) / step - 0.5));
        if (begin >= end) continue;
        const px = west + (begin + 0.5) * step;
        const wa = ((xb - px) * (yc - py) - (xc - px) * (yb - py)) / area, wb = ((xc - px) * (ya - py) - (xa - px) * (yc - py)) / area;
        const wc = 1 - wa - wb, gc = -ga - gb;
        let d = wa * depth[a] + wb * depth[b] + wc * depth[c], v = wa * speed[a] + wb * speed[b] + wc * speed[c];
        let p = (wa * psi[a] + wb * psi[b] + wc * psi[c]) * perTube;
        const dd = ga * depth[a] + gb * depth[b] + gc * depth[c], dv = ga * speed[a] + gb * speed[b] + gc * speed[c];
        const dp = (ga * psi[a] + gb * psi[b] + gc * psi[c]) * perTube;
        for (let o = r * columns + begin, stop = r * columns + end; o < stop; o += 1, d += dd, v += dv, p += dp) {
          if (d <= least) continue;
          const shade = 1 + Math.min(Math.max(v * scale, 0), 126);
          pixels[o] = palette[(Math.floor(p) & 1 ? 127 : 0) + (shade | 0)];
        }
      }
    }
  }

  // Calls line(x1, y1, x2, y2) for each piece of the lines between tubes inside the box.
  function tubeLines(mesh, field, [west, south, east, north], line) {
    if (!(field.tube > 0)) return;
    const { x, y, triangles } = mesh, { psi } = field.on(mesh), corner = [0, 0, 0], cut = [0, 0, 0, 0];
    for (let t = 0; t < mesh.count; t += 1) {
      if (!field.carries(t)) continue;
      for (let k = 0; k < 3; k += 1) corner[k] = triangles[3 * t + k];
      const [a, b, c] = corner;
      const least = Math.min(psi[a], psi[b], psi[c]), most = Math.max(psi[a], psi[b], psi[c]);
      let level = Math.ceil(least / field.tube);
      if (level * field.tube > most) continue;
      if (Math.min(x[a], x[b], x[c]) > east || Math.max(x[a], x[b], x[c]) < west) continue;
      if (Math.min(y[a], y[b], y[c]) > north || Math.max(y[a], y[b], y[c]) < south) continue;
      for (; level * field.tube <= most; level += 1) {
        const value = level * field.tube;
        let found = 0;
        for (let k = 0; k < 3 && found < 4; k += 1) {
          const i = corner[k], j = corner[(k + 1) % 3];
          if ((psi[i] < value) === (psi[j] < value)) continue;
          const s = (value - psi[i]) / (psi[j] - psi[i]);
          cut[found++] = x[i] + s * (x[j] - x[i]);
          cut[found++] = y[i] + s * (y[j] - y[i]);
        }
        if (found === 4) line(cut[0], cut[1], cut[2], cut[3]);
      }
    }
  }

  return { Mesh, Field, paint, tubeLines };
})();
