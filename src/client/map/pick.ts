import { Delaunay } from 'd3-delaunay';

export interface Picker {
  /** Nearest point to a place, or -1 when there is none within `reach`; map kilometres. */
  near(x: number, y: number, reach: number): number;
  /** The joined point that lies best in a direction (a unit vector), or -1 when none lies within 75 degrees of it. */
  step(from: number, dx: number, dy: number): number;
  /** Distance to the farthest joined point. */
  spacing(of: number): number;
}

/** Finds points by place and by direction; the triangulation behind it is made when first asked for. */
export const createPicker = (positions: Float32Array): Picker => {
  let delaunay: Delaunay<Float32Array> | null = null;
  let last = 0;
  const made = (): Delaunay<Float32Array> => (delaunay ??= new Delaunay(positions));
  return {
    near(x, y, reach) {
      if (positions.length === 0) return -1;
      const found = made().find(x, y, last);
      if (!(found >= 0)) return -1;
      last = found;
      return Math.hypot(positions[2 * found] - x, positions[2 * found + 1] - y) <= reach ? found : -1;
    },
    step(from, dx, dy) {
      let best = -1;
      let least = Infinity;
      for (const k of made().neighbors(from)) {
        const vx = positions[2 * k] - positions[2 * from], vy = positions[2 * k + 1] - positions[2 * from + 1];
        const length = Math.hypot(vx, vy);
        const cosine = (vx * dx + vy * dy) / length;
        if (!(cosine > 0.26)) continue;
        // a longer way counts against a straighter one
        const cost = length / cosine ** 2;
        if (cost < least) {
          least = cost;
          best = k;
        }
      }
      return best;
    },
    spacing(of) {
      let farthest = 0;
      for (const k of made().neighbors(of)) farthest = Math.max(farthest, Math.hypot(positions[2 * k] - positions[2 * of], positions[2 * k + 1] - positions[2 * of + 1]));
      return farthest;
    },
  };
};
