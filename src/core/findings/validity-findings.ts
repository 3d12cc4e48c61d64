import type { ElementQuality } from '#core/geometry/quality.ts';
import type { CheckedMesh } from './checked-mesh.ts';
import type { Measured } from './judge.ts';
import { placesOf } from './judge.ts';
import type { MeshTopology } from './topology.ts';

const SOURCE = 'Euler-Poincaré formula; de Berg et al. 2008, Computational Geometry, section 2.2';

/** Is this a triangulation of one domain, and are the observations its nodes? Figures are counts of what is wrong. */
export function validityFindings(mesh: CheckedMesh, positions: Float64Array, topology: MeshTopology, quality: ElementQuality): Measured[] {
  const inverted = [...topology.malformed];
  const isMalformed = new Set(topology.malformed);
  quality.areaKm2.forEach((area, e) => {
    if (!(area > 0) && !isMalformed.has(e)) inverted.push(e);
  });
  const duplicates = duplicateNodes(positions);
  const astray = observationsAstray(mesh, topology.nodes);
  const loops = loopFigure(mesh, topology);
  const euler = topology.nodes - topology.orphans.length - topology.edges + (topology.elements - topology.malformed.length);
  const expected = 2 * topology.components - topology.loops.length;
  const base = { group: 'validity', unit: '', source: SOURCE } as const;
  return [
    {
      ...base, id: 'orientation', title: 'Elements turned over or without area', value: inverted.length, ...placesOf('elements', inverted),
      explanation: `Every element must be counter-clockwise with a positive area, or the integrals over it carry the wrong sign. ${count(inverted.length, 'element is', 'elements are')} turned over, flat or malformed.`,
    },
    {
      ...base, id: 'edge-sharing', title: 'Elements that overlap along an edge', value: topology.overlapping.length, ...placesOf('elements', topology.overlapping),
      explanation: `An edge belongs to one element on either side; two on the same side cover the same ground twice, and so does the mass matrix. ${count(topology.overlapping.length, 'element shares', 'elements share')} an edge in that way.`,
    },
    {
      ...base, id: 'euler-characteristic', title: 'Euler characteristic off by', value: Math.abs(euler - expected), ...placesOf('nodes', topology.pinched),
      explanation: `Nodes minus edges plus elements must equal twice the pieces minus the boundary loops, or the surface is torn, folded or pinched. It is ${euler} where ${expected} is due (${topology.components} ${topology.components === 1 ? 'piece' : 'pieces'}, ${topology.loops.length} ${topology.loops.length === 1 ? 'loop' : 'loops'}).`,
    },
    { ...base, id: 'boundary-loops', title: 'Boundary loops not accounted for', ...loops },
    {
      ...base, id: 'orphan-nodes', title: 'Nodes without an element', value: topology.orphans.length, ...placesOf('nodes', topology.orphans),
      explanation: `A node that no element uses has an empty row in both matrices, which makes the system singular. ${count(topology.orphans.length, 'node has', 'nodes have')} no element.`,
    },
    {
      ...base, id: 'duplicate-nodes', title: 'Nodes at the place of another', value: duplicates.length, ...placesOf('nodes', duplicates),
      explanation: `Two nodes at one place tear the mesh there: correlations do not pass between them. ${count(duplicates.length, 'node lies', 'nodes lie')} exactly on another one.`,
    },
    { ...base, id: 'observations-on-nodes', title: 'Observations without a node of their own', ...astray },
  ];
}

function count(n: number, one: string, many: string): string {
  return n === 0 ? `No ${one}` : `${n.toLocaleString('en-GB')} ${n === 1 ? one : many}`;
}

/** Every node but the first of each group at exactly the same position. */
function duplicateNodes(p: Float64Array): number[] {
  const order = Uint32Array.from({ length: p.length / 3 }, (_, i) => i);
  order.sort((a, b) => p[3 * a] - p[3 * b] || p[3 * a + 1] - p[3 * b + 1] || p[3 * a + 2] - p[3 * b + 2] || a - b);
  const duplicates: number[] = [];
  for (let k = 1; k < order.length; k++) {
    const a = 3 * order[k - 1];
    const b = 3 * order[k];
    if (p[a] === p[b] && p[a + 1] === p[b + 1] && p[a + 2] === p[b + 2]) duplicates.push(order[k]);
  }
  return duplicates.sort((a, b) => a - b);
}

function observationsAstray(mesh: CheckedMesh, nodes: number): Pick<Measured, 'value' | 'explanation' | 'place' | 'placeCount'> {
  const purpose = 'The operator correlates errors at nodes, so every observation needs a node that is its alone.';
  if (!mesh.observationNode)
    return { value: null, place: {}, placeCount: 0, explanation: `${purpose} Not judged: the mesh came without an observation-to-node map.` };
  const taken = new Int32Array(nodes).fill(-1);
  const astray: number[] = [];
  mesh.observationNode.forEach((node, i) => {
    const isOwn = node < nodes && taken[node] < 0 && (mesh.nodeObservation === undefined || mesh.nodeObservation[node] === i);
    if (isOwn) taken[node] = i;
    else astray.push(i);
  });
  return { value: astray.length, ...placesOf('observations', astray), explanation: `${purpose} ${count(astray.length, 'observation lacks', 'observations lack')} one.` };
}

/** Loops of the elements that the design does not have, and the other way round. */
function loopFigure(mesh: CheckedMesh, topology: MeshTopology): Pick<Measured, 'value' | 'explanation' | 'place' | 'placeCount'> {
  const purpose = 'The natural boundary condition holds on every edge that has an element on one side only, so a gap in the mesh acts as a hole.';
  const found = topology.loops.length;
  if (!mesh.boundaryLoops)
    return { value: null, place: {}, placeCount: 0, explanation: `${purpose} Not judged: ${found} ${found === 1 ? 'loop was' : 'loops were'} found, and no design says how many there should be.` };
  const key = (loop: Uint32Array) => {
    let first = 0;
    loop.forEach((node, k) => {
      if (node < loop[first]) first = k;
    });
    return [...loop.subarray(first), ...loop.subarray(0, first)].join(',');
  };
  const designed = new Set(mesh.boundaryLoops.map(key));
  const extra = topology.loops.filter((loop) => !designed.delete(key(loop)));
  const wrong = extra.length + designed.size;
  return {
    value: wrong,
    ...placesOf('nodes', extra.flatMap((loop) => [...loop])),
    explanation: `${purpose} The elements have ${found} ${found === 1 ? 'loop' : 'loops'}, the design ${mesh.boundaryLoops.length}, and ${wrong === 0 ? 'they agree' : `${wrong} differ`}.`,
  };
}
