/** Turning beyond this at one node is a corner rather than part of a polygonal arc, radians. */
const CORNER_TURNING = Math.PI / 6;

/**
 * Signed curvature in 1/km of each boundary edge of a mesh made elsewhere, loop after loop: the smaller, in magnitude,
 * of the turnings at its two ends over the edge's length where both turn the same way by less than 30 degrees, else 0.
 */
export function estimateCurvature(loops: Uint32Array[], positions: Float64Array, isSphere: boolean): Float64Array {
  const out: number[] = [];
  for (const loop of loops) {
    const turnings = Array.from(loop, (_, k) => turningAt(loop, k, positions, isSphere));
    for (let k = 0; k < loop.length; k++) {
      const here = turnings[k];
      const there = turnings[(k + 1) % loop.length];
      const isArc = here * there > 0 && Math.abs(here) < CORNER_TURNING && Math.abs(there) < CORNER_TURNING;
      const turning = Math.abs(here) < Math.abs(there) ? here : there;
      out.push(isArc ? turning / length3(edge(positions, loop[k], loop[(k + 1) % loop.length])) : 0);
    }
  }
  return Float64Array.from(out);
}

function turningAt(loop: Uint32Array, k: number, p: Float64Array, isSphere: boolean): number {
  const node = loop[k];
  const a = edge(p, loop[(k + loop.length - 1) % loop.length], node);
  const b = edge(p, node, loop[(k + 1) % loop.length]);
  const cross = [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
  const up = isSphere ? [p[3 * node], p[3 * node + 1], p[3 * node + 2]] : [0, 0, 1];
  const sine = (cross[0] * up[0] + cross[1] * up[1] + cross[2] * up[2]) / length3(up);
  return Math.atan2(sine, a[0] * b[0] + a[1] * b[1] + a[2] * b[2]);
}

const edge = (p: Float64Array, a: number, b: number): number[] => [p[3 * b] - p[3 * a], p[3 * b + 1] - p[3 * a + 1], p[3 * b + 2] - p[3 * a + 2]];
const length3 = (v: number[]): number => Math.hypot(v[0], v[1], v[2]);
