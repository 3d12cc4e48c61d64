import { nextHalfEdge } from './topology.ts';
import type { MeshTopology } from './topology.ts';
import type { ElementQuality } from '#core/geometry/quality.ts';
import type { SparseMatrix } from '#core/sparse/matrix.ts';
import type { CheckedMesh } from './checked-mesh.ts';
import type { Limits, Measured } from './judge.ts';
import { placesOf, quantile, worstBeyond } from './judge.ts';

/** K_ij above this share of the diagonal counts as positive; exact right-angled grids give 1e-14. */
const POSITIVE_SHARE = 1e-10;

/** An element on the boundary whose angle facing it exceeds this is a hull sliver, degrees. Common practice, no source. */
const SLIVER_ANGLE = 135;

/** The shape of the elements: which of it bears on accuracy and which only on conditioning. */
export function qualityFindings(mesh: CheckedMesh, positions: Float64Array, topology: MeshTopology, quality: ElementQuality, stiffness: SparseMatrix | null, limits: Limits): Measured[] {
  return [
    smallestAngle(quality, limits),
    ...positiveOffDiagonals(mesh, stiffness),
    hullSlivers(mesh, positions, topology),
    sizeRatio(mesh, topology, quality, limits),
  ];
}

function smallestAngle(quality: ElementQuality, limits: Limits): Measured {
  const all = Uint32Array.from(quality.smallestAngle, (_, e) => e);
  const places = worstBeyond(quality.smallestAngle, all, limits['smallest-angle'].warn, 'below');
  const value = places.length > 0 ? quality.smallestAngle[places[0]] : null;
  return {
    id: 'smallest-angle', group: 'quality', title: 'Smallest angle', value, unit: 'deg', direction: 'below', ...placesOf('elements', places),
    source: 'Shewchuk 2002, What is a good linear finite element?, section 3',
    explanation: `It protects the conditioning of the linear solves: needles make the stiffness matrix stiff and cost digits. It does not predict the accuracy of the correlations; in measurements on random meshes the two were unrelated.`,
  };
}

/** Column-by-column upper triangle of K: pairs whose entry is positive beyond rounding. */
export function positivePairs(stiffness: SparseMatrix): { pairs: [number, number][]; share: number[] } {
  const { colPtr, rowIdx, values } = stiffness;
  const diagonal = new Float64Array(stiffness.columns);
  for (let j = 0; j < stiffness.columns; j++) for (let p = colPtr[j]; p < colPtr[j + 1]; p++) if (rowIdx[p] === j) diagonal[j] = values[p];
  const pairs: [number, number][] = [];
  const share: number[] = [];
  for (let j = 0; j < stiffness.columns; j++)
    for (let p = colPtr[j]; p < colPtr[j + 1] && rowIdx[p] < j; p++) {
      const scale = Math.min(diagonal[rowIdx[p]], diagonal[j]);
      if (values[p] <= POSITIVE_SHARE * scale) continue;
      pairs.push([rowIdx[p], j]);
      share.push(values[p] / scale);
    }
  return { pairs, share };
}

function positiveOffDiagonals(mesh: CheckedMesh, stiffness: SparseMatrix | null): Measured[] {
  const source = 'Discrete maximum principle: Ciarlet & Raviart 1973; Xu & Zikatanov 1999, section 2';
  const base = { group: 'quality', unit: '', source } as const;
  const why = 'A positive entry in the stiffness matrix comes from an edge whose opposite angles exceed 180° together, or from an obtuse angle facing the boundary, and it does predict errors: correlations there can overshoot or turn negative.';
  if (!stiffness) {
    const none = { ...base, value: null, place: {}, placeCount: 0, explanation: `${why} Not judged: the matrices could not be assembled.` };
    return [
      { ...none, id: 'positive-off-diagonals', title: 'Positive off-diagonals of K' },
      { ...none, id: 'positive-off-diagonals-at-observations', title: 'Positive off-diagonals of K at an observation' },
    ];
  }
  const { pairs, share } = positivePairs(stiffness);
  const order = pairs.map((_, k) => k).sort((a, b) => share[b] - share[a]);
  const nodes = [...new Set(order.flatMap((k) => pairs[k]))];
  const all: Measured = {
    ...base, id: 'positive-off-diagonals', title: 'Positive off-diagonals of K', value: pairs.length, ...placesOf('nodes', nodes),
    explanation: `${why} ${pairs.length === 0 ? 'There are none, as in a true Delaunay mesh.' : `There are ${pairs.length}.`}`,
  };
  const title = 'Positive off-diagonals of K at an observation';
  if (!mesh.observationNode)
    return [all, { ...base, id: 'positive-off-diagonals-at-observations', title, value: null, place: {}, placeCount: 0, explanation: 'Next to an observation such an entry distorts the correlations that are asked for. Not judged: the mesh came without an observation-to-node map.' }];
  const isObservation = new Uint8Array(stiffness.columns);
  for (const node of mesh.observationNode) if (node < isObservation.length) isObservation[node] = 1;
  const touching = order.filter((k) => isObservation[pairs[k][0]] || isObservation[pairs[k][1]]);
  return [all, {
    ...base, id: 'positive-off-diagonals-at-observations', title, value: touching.length,
    ...placesOf('nodes', [...new Set(touching.flatMap((k) => pairs[k]))]),
    explanation: `Next to an observation such an entry distorts the very correlations that the operator is used for. ${touching.length === 0 ? 'No observation is touched.' : `${touching.length} ${touching.length === 1 ? 'entry touches' : 'entries touch'} an observation.`}`,
  }];
}

function hullSlivers(mesh: CheckedMesh, p: Float64Array, topology: MeshTopology): Measured {
  const t = mesh.triangles;
  const limit = Math.cos((SLIVER_ANGLE * Math.PI) / 180);
  const isMalformed = new Set(topology.malformed);
  const found = new Map<number, number>();
  for (let h = 0; h < t.length; h++) {
    const e = Math.floor(h / 3);
    if (topology.twin[h] >= 0 || isMalformed.has(e)) continue;
    const a = 3 * t[h], b = 3 * t[nextHalfEdge(h)], c = 3 * t[nextHalfEdge(nextHalfEdge(h))];
    let dot = 0, ca = 0, cb = 0;
    for (let k = 0; k < 3; k++) {
      const u = p[a + k] - p[c + k];
      const v = p[b + k] - p[c + k];
      dot += u * v;
      ca += u * u;
      cb += v * v;
    }
    const cosine = dot / Math.sqrt(ca * cb);
    if (cosine < limit) found.set(e, cosine);
  }
  const elements = [...found.keys()].sort((x, y) => (found.get(x) as number) - (found.get(y) as number));
  return {
    id: 'hull-slivers', group: 'quality', title: 'Slivers along the boundary', value: elements.length, unit: '', ...placesOf('elements', elements),
    source: `Angle facing the boundary above ${SLIVER_ANGLE}°: common practice, no source`,
    explanation: `Flat elements along a raw hull do predict errors: they gave correlations down to -0.4 in measurements, and a ring of buffer elements removed them. ${elements.length === 0 ? 'There are none.' : `${elements.length} ${elements.length === 1 ? 'element faces' : 'elements face'} the boundary with more than ${SLIVER_ANGLE}°.`}`,
  };
}

function sizeRatio(mesh: CheckedMesh, topology: MeshTopology, quality: ElementQuality, limits: Limits): Measured {
  const isObservation = new Uint8Array(topology.nodes);
  for (const node of mesh.observationNode ?? []) if (node < topology.nodes) isObservation[node] = 1;
  const t = mesh.triangles;
  const isFiller = (e: number) => !(isObservation[t[3 * e]] && isObservation[t[3 * e + 1]] && isObservation[t[3 * e + 2]]);
  const ratios: number[] = [];
  const edges: number[] = [];
  for (let h = 0; h < t.length; h++) {
    const g = topology.twin[h];
    if (g < h) continue;
    const a = Math.floor(h / 3);
    const b = Math.floor(g / 3);
    const areas = [Math.abs(quality.areaKm2[a]), Math.abs(quality.areaKm2[b])];
    if (!isFiller(a) || !isFiller(b) || areas[0] === 0 || areas[1] === 0) continue;
    ratios.push(Math.sqrt(Math.max(...areas) / Math.min(...areas)));
    edges.push(h);
  }
  const worst = worstBeyond(ratios, edges, limits['size-ratio'].warn, 'above');
  const elements = [...new Set(worst.slice(0, 200).flatMap((h) => [Math.floor(h / 3), Math.floor(topology.twin[h] / 3)]))];
  return {
    id: 'size-ratio', group: 'quality', title: 'Size ratio of neighbouring buffer elements, 95th percentile', value: quantile(ratios, 0.95), unit: '',
    ...placesOf('elements', elements), placeCount: worst.length,
    source: 'Square root of the area ratio across edges: common practice, no source; limits measured on graded meshes',
    explanation: 'It protects accuracy: elements that grow too fast outside the observations change the variance inside by some per cent. Growth of 1.2 per element costs at most 1 %, 1.5 costs 2 to 3 %, and 2 costs 4 to 5 %.',
  };
}
