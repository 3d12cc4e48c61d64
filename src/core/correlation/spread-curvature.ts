import type { BoundarySegments } from './boundary-segments.ts';

/** How far along the boundary curvature acts, in diffusion scales: fitted to finite elements at rounded corners from 1 D on. */
const SPREAD = 2;

/**
 * Curvature in 1/km of each boundary edge, averaged along its loop with weight exp(-distance / (SPREAD l)): a curved
 * stretch much shorter than l focuses less where it is and a little beside it. A circle keeps its curvature.
 */
export function spreadCurvature(segments: BoundarySegments, scaleKm: number): Float64Array {
  const { curvature, groupStart, loopGroups } = segments;
  const out = new Float64Array(curvature.length);
  const width = SPREAD * scaleKm;
  for (const [first, last] of loopGroups) {
    const from = groupStart[first];
    const count = groupStart[last] - from;
    const length = Float64Array.from({ length: count }, (_, k) => edgeLength(segments, first, last, from + k));
    for (let k = 0; k < count; k++) {
      // the edge itself, from its middle to both ends
      let weight = 2 * (1 - Math.exp(-length[k] / 2 / width));
      let sum = weight * curvature[from + k];
      for (const step of [1, -1]) {
        let near = Math.exp(-length[k] / 2 / width);
        for (let j = 1; j < count && near > 1e-3; j++) {
          const e = (((k + step * j) % count) + count) % count;
          const far = near * Math.exp(-length[e] / width);
          weight += near - far;
          sum += (near - far) * curvature[from + e];
          near = far;
        }
      }
      out[from + k] = sum / weight;
    }
  }
  return out;
}

function edgeLength(segments: BoundarySegments, first: number, last: number, edge: number): number {
  let group = first;
  while (group + 1 < last && segments.groupStart[group + 1] <= edge) group++;
  const q = 3 * (edge + group);
  const p = segments.positions;
  return Math.hypot(p[q + 3] - p[q], p[q + 4] - p[q + 1], p[q + 5] - p[q + 2]);
}
