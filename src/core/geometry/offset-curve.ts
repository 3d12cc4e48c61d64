/** A boundary laid out as vertices, in plane coordinates of the triangulation. */
export interface BoundaryVertices {
  /** 2 per vertex, counter-clockwise. */
  boundary: Float64Array;
  /** Mean curvature in 1/km along boundary edge k, from vertex k to k + 1: 0 on straight stretches, positive on arcs. */
  curvature: Float64Array;
}

/** A stretch of a closed curve, straight or an arc; each starts where the one before it ends. */
export interface Stretch {
  /** Length on the ground, km. */
  length: number;
  /** Longest edge that may stand for a part of it, km. */
  step: number;
  /** Curvature, 1/km. */
  bend: number;
  /** Whether the curve turns sharply where the stretch starts, so that a vertex stands there. */
  isCorner: boolean;
  /** Appends the plane position at a share of the length, 0 to 1. */
  push(share: number, out: number[]): void;
}

/** A stretch this little longer than a whole number of steps gets no vertex more: lengths are rounded. */
const STEP_SLACK = 1e-9;

/**
 * Vertices on a closed curve: at its corners, and between two corners as few as keep the steps, at equal shares of
 * the steps. Stretches shorter than a step are cut across, so that no boundary edge is much shorter than its neighbours.
 */
export const layVertices = (stretches: Stretch[]): BoundaryVertices => {
  const count = stretches.length;
  const firstCorner = Math.max(0, stretches.findIndex((s) => s.isCorner));
  const inOrder = stretches.map((_, k) => stretches[(firstCorner + k) % count]);
  const points: number[] = [];
  const curvature: number[] = [];
  for (let from = 0; from < count; ) {
    let to = from + 1;
    while (to < count && !inOrder[to].isCorner) to++;
    layChain(inOrder.slice(from, to), inOrder[from].isCorner ? 1 : 3, points, curvature);
    from = to;
  }
  return { boundary: Float64Array.from(points), curvature: Float64Array.from(curvature) };
};

/** Vertices of a chain of stretches but its last, at least `fewest`. */
const layChain = (chain: Stretch[], fewest: number, points: number[], curvature: number[]): void => {
  const total = chain.reduce((sum, s) => sum + s.length / s.step, 0);
  const edges = Math.max(fewest, Math.ceil(total - STEP_SLACK));
  let k = 0;
  // steps before stretch k, and length and turning from the edge's start to the place reached
  let before = 0;
  let reached = 0, length = 0, turning = 0;
  const advance = (target: number): void => {
    for (;;) {
      const s = chain[k];
      const end = before + s.length / s.step;
      const isLast = k + 1 === chain.length;
      const stop = target <= end || isLast ? target : end;
      length += (stop - reached) * s.step;
      turning += (stop - reached) * s.step * s.bend;
      reached = stop;
      if (target <= end || isLast) return;
      before = end;
      k++;
    }
  };
  for (let edge = 0; edge < edges; edge++) {
    const s = chain[k];
    const steps = s.length / s.step;
    s.push(steps > 0 ? Math.min(1, (reached - before) / steps) : 0, points);
    length = turning = 0;
    advance((total * (edge + 1)) / edges);
    curvature.push(length > 0 ? turning / length : 0);
  }
};
