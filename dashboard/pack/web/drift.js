// Parcels: let go on the water and moved by the frames, linear in time between them, triangle by triangle.
//
// Bogacki and Shampine 1989 (Appl. Math. Lett. 2, 321-325): third order with a second-order error estimate.
// A parcel that meets a wall goes on along it; it ends at an open boundary, and lies aground where the water is
// no deeper than the wet threshold, until it returns.
"use strict";

const DRIFT = (() => {
  const TOLERANCE = 1e-3; // m a step
  const LEAST = 1e-6; // s, the shortest step
  const HAIR = 1e-5; // share of a side's length that a parcel keeps off a wall

  class Tracer {
    // `fields` and `seconds` by frame; one frame is taken as steady.
    constructor(mesh, fields, seconds) {
      Object.assign(this, { mesh, fields, seconds });
      this.w = [0, 0, 0];
      this.v = [0, 0, 0]; // u, v, depth
      this.last = 0;
      this.side = -1;
    }

    // Walk from triangle t towards a point: the triangle there, or -1 with the last one and the side it met.
    walk(t, px, py) {
      const { mesh, w } = this;
      for (let n = 0; n < 10000; n += 1) {
        mesh.weights(t, px, py, w);
        let low = w[0], side = 1; // corner 0 lies across side 1, corner 1 across side 2, corner 2 across side 0
        if (w[1] < low) [low, side] = [w[1], 2];
        if (w[2] < low) [low, side] = [w[2], 0];
        if (low >= -1e-9) return t;
        const next = mesh.neighbours[3 * t + side];
        if (next < 0) {
          this.last = t;
          this.side = side;
          return -1;
        }
        t = next;
      }
      this.last = t;
      this.side = -1;
      return -1;
    }

    // Velocity and depth in triangle t at a time between frames k and k + 1, into this.v.
    velocity(k, now, t, px, py) {
      const { mesh, w, v } = this, one = this.fields[k], two = this.fields[Math.min(k + 1, this.fields.length - 1)];
      const share = one === two ? 0 : (now - this.seconds[k]) / (this.seconds[k + 1] - this.seconds[k]);
      mesh.weights(t, px, py, w);
      let qx = 0, qy = 0, h = 0;
      for (let c = 0; c < 3; c += 1) {
        const i = mesh.triangles[3 * t + c];
        qx += w[c] * ((1 - share) * one.qxStep * one.qx[i] + share * two.qxStep * two.qx[i]);
        qy += w[c] * ((1 - share) * one.qyStep * one.qy[i] + share * two.qyStep * two.qy[i]);
        h += w[c] * ((1 - share) * one.depth(i) + share * two.depth(i));
      }
      const wet = h > one.wet;
      v[0] = wet ? qx / h : 0;
      v[1] = wet ? qy / h : 0;
      v[2] = h;
    }

    // Move a parcel {x, y, t, now, step, state} to `until`, between frames k and k + 1.
    move(parcel, k, until) {
      const close = 1e-9 * Math.max(1, Math.abs(until));
      while (until - parcel.now > close && parcel.state !== "left") {
        this.velocity(k, parcel.now, parcel.t, parcel.x, parcel.y);
        const [u, v, h] = this.v;
        if (h <= this.fields[k].wet) this.wait(parcel, k, until);
        else this.stride(parcel, k, until, u, v);
      }
    }

    // Aground: a twentieth of the gap between frames passes before the water is looked at again.
    wait(parcel, k, until) {
      const gap = k + 1 < this.seconds.length ? this.seconds[k + 1] - this.seconds[k] : Infinity;
      parcel.now = Math.min(until, parcel.now + gap / 20);
      parcel.state = "aground";
    }

    // One step with an error below the tolerance, no longer than the triangle allows.
    stride(parcel, k, until, u1, v1) {
      const { x, y, t, now } = parcel, speed = Math.hypot(u1, v1), size = this.sizeOf(t);
      parcel.state = "afloat";
      let d = Math.min(parcel.step, until - now);
      if (speed * d > 0.7 * size) d = (0.7 * size) / speed;
      for (;;) {
        const tried = this.tried(k, parcel, d, u1, v1);
        if (tried !== null) {
          if (tried.error > TOLERANCE && d > LEAST) {
            d *= Math.max(0.2, 0.9 * Math.cbrt(TOLERANCE / tried.error));
            continue;
          }
          const grow = tried.error === 0 ? 5 : Math.min(5, 0.9 * Math.cbrt(TOLERANCE / tried.error));
          Object.assign(parcel, { x: tried.x, y: tried.y, t: tried.t, now: now + d, step: Math.max(d * grow, LEAST) });
          return;
        }
        if (d * speed > 0.02 * size && d > LEAST) d *= 0.5;
        else break;
      }
      const straight = this.walk(t, x + d * u1, y + d * v1);
      if (straight >= 0) Object.assign(parcel, { x: x + d * u1, y: y + d * v1, t: straight, now: now + d });
      else if (this.side >= 0 && this.mesh.open[3 * this.last + this.side]) parcel.state = "left";
      else this.slide(parcel, d, u1, v1);
    }

    // The three stages; null where one of them leaves the mesh.
    tried(k, { x, y, t, now }, d, u1, v1) {
      const { v } = this;
      const t2 = this.walk(t, x + 0.5 * d * u1, y + 0.5 * d * v1);
      if (t2 < 0) return null;
      this.velocity(k, now + 0.5 * d, t2, x + 0.5 * d * u1, y + 0.5 * d * v1);
      const u2 = v[0], v2 = v[1], t3 = this.walk(t2, x + 0.75 * d * u2, y + 0.75 * d * v2);
      if (t3 < 0) return null;
      this.velocity(k, now + 0.75 * d, t3, x + 0.75 * d * u2, y + 0.75 * d * v2);
      const u3 = v[0], v3 = v[1];
      const nx = x + (d * (2 * u1 + 3 * u2 + 4 * u3)) / 9, ny = y + (d * (2 * v1 + 3 * v2 + 4 * v3)) / 9;
      const t4 = this.walk(t3, nx, ny);
      if (t4 < 0) return null;
      this.velocity(k, now + d, t4, nx, ny);
      const ex = d * ((-5 * u1) / 72 + u2 / 12 + u3 / 9 - v[0] / 8), ey = d * ((-5 * v1) / 72 + v2 / 12 + v3 / 9 - v[1] / 8);
      return { x: nx, y: ny, t: t4, error: Math.hypot(ex, ey) };
    }

    // Along the wall that the last walk met, a hair inside.
    slide(parcel, d, u, v) {
      const { mesh } = this, i = mesh.triangles[3 * this.last + this.side], j = mesh.triangles[3 * this.last + ((this.side + 1) % 3)];
      const ex = mesh.x[j] - mesh.x[i], ey = mesh.y[j] - mesh.y[i], length = Math.hypot(ex, ey), along = (u * ex + v * ey) / length;
      const nx = parcel.x + (d * along * ex) / length - HAIR * ey, ny = parcel.y + (d * along * ey) / length + HAIR * ex;
      const t = this.walk(parcel.t, nx, ny);
      if (t >= 0) Object.assign(parcel, { x: nx, y: ny, t });
      parcel.now += d;
    }

    sizeOf(t) {
      const { x, y, triangles } = this.mesh, a = triangles[3 * t], b = triangles[3 * t + 1], c = triangles[3 * t + 2];
      const area = Math.abs((x[b] - x[a]) * (y[c] - y[a]) - (y[b] - y[a]) * (x[c] - x[a]));
      return Math.sqrt(area);
    }

    // A parcel let go at a point at a time: places every `every` s until `end`, or null off the water.
    // Gives {x, y, seconds, states}: after it left, its last place is not repeated.
    trace(px, py, begin, end, every) {
      const t = this.mesh.find(px, py);
      if (t < 0) return null;
      const last = Math.max(0, this.seconds.length - 2);
      const parcel = { x: px, y: py, t, now: begin, step: 1, state: "afloat" };
      const track = { x: [px], y: [py], seconds: [begin], states: ["afloat"] };
      let k = 0;
      while (k < last && this.seconds[k + 1] <= begin) k += 1;
      for (let n = 1; track.seconds.at(-1) < end - 1e-9 && parcel.state !== "left"; n += 1) {
        const stop = Math.min(begin + n * every, end);
        while (k < last && this.seconds[k + 1] < stop - 1e-9) {
          this.move(parcel, k, this.seconds[k + 1]);
          k += 1;
        }
        this.move(parcel, k, stop);
        track.x.push(parcel.x);
        track.y.push(parcel.y);
        track.seconds.push(parcel.state === "left" ? parcel.now : stop);
        track.states.push(parcel.state);
      }
      return track;
    }
  }

  return { Tracer };
})();
