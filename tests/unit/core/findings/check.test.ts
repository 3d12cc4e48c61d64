import { describe, expect, it } from 'vitest';

import type { CorrelationModel } from '#core/correlation/model.ts';
import { checkMesh } from '#core/findings/check.ts';
import type { CheckedMesh } from '#core/findings/checked-mesh.ts';
import type { FindingPolicy } from '#core/findings/finding.ts';
import { FINDING_IDS } from '#core/findings/policy.ts';
import { checkFiguresSchema, findingSchema } from '#schemas/findings.ts';

const model: CorrelationModel = { kind: 'scalar', daleyKm: 5, steps: 10, mass: 'consistent', normalisation: 'exact', tolerance: 0.01, sphereRadiusKm: 6371 };
const SIZE = 21;
const MARGIN = 6;

/** A square grid of 1 km with alternating diagonals; the nodes more than MARGIN from the side are observations. */
function grid(): Required<Pick<CheckedMesh, 'observationNode' | 'boundaryLoops' | 'boundaryCurvature'>> & CheckedMesh {
  const coordinates: number[] = [];
  const triangles: number[] = [];
  const observations: number[] = [];
  for (let j = 0; j < SIZE; j++)
    for (let i = 0; i < SIZE; i++) {
      if (Math.min(i, j, SIZE - 1 - i, SIZE - 1 - j) >= MARGIN) observations.push(coordinates.length / 2);
      coordinates.push(i, j);
    }
  for (let j = 0; j + 1 < SIZE; j++)
    for (let i = 0; i + 1 < SIZE; i++) {
      const a = j * SIZE + i;
      if ((i + j) % 2 === 0) triangles.push(a, a + 1, a + SIZE + 1, a, a + SIZE + 1, a + SIZE);
      else triangles.push(a, a + 1, a + SIZE, a + 1, a + SIZE + 1, a + SIZE);
    }
  const loop: number[] = [];
  for (let k = 0; k < SIZE - 1; k++) loop.push(k);
  for (let k = 0; k < SIZE - 1; k++) loop.push(k * SIZE + SIZE - 1);
  for (let k = SIZE - 1; k > 0; k--) loop.push((SIZE - 1) * SIZE + k);
  for (let k = SIZE - 1; k > 0; k--) loop.push(k * SIZE);
  return {
    crs: 'plane-km', radiusKm: 0, coordinates: Float64Array.from(coordinates), triangles: Uint32Array.from(triangles),
    observationNode: Uint32Array.from(observations), boundaryLoops: [Uint32Array.from(loop)], boundaryCurvature: new Float64Array(loop.length),
  };
}

const check = (mesh: CheckedMesh, over: Partial<CorrelationModel> = {}, policy?: FindingPolicy) => checkMesh({ mesh, model: { ...model, ...over }, policy, rowsSelected: 81 });
const finding = (mesh: CheckedMesh, id: string, over: Partial<CorrelationModel> = {}) => {
  const found = check(mesh, over).findings.find((f) => f.id === id);
  if (!found) throw new Error(`No finding ${id}`);
  return found;
};
const node = (i: number, j: number) => j * SIZE + i;

describe('a sound mesh', () => {
  const { findings, figures } = check(grid());

  it('has every finding once, in order, in the shape of the contract', () => {
    expect(findings.map((f) => f.id)).toEqual([...FINDING_IDS]);
    for (const f of findings) expect(findingSchema.parse(f)).toEqual(f);
    expect(checkFiguresSchema.parse(figures)).toEqual(figures);
  });

  it('passes all that is judged, but for its nearness to the boundary', () => {
    const others = findings.filter((f) => f.group !== 'boundary' && f.verdict !== 'pass').map((f) => f.id);
    expect(others).toEqual([]);
  });

  it('has the figures of a grid', () => {
    expect(figures.nodes).toBe(SIZE * SIZE);
    expect(figures.elements).toBe(2 * (SIZE - 1) ** 2);
    expect(figures.areaKm2).toBeCloseTo(400, 10);
    expect(figures.matrices.mass.sum).toBeCloseTo(400, 10);
    expect(figures.matrices.lumpedMass.trace).toBeCloseTo(400, 10);
    expect(figures.smallestAngleHistogram.reduce((a, b) => a + b)).toBe(figures.elements);
    expect(figures.matrices.stiffness.positiveOffDiagonals).toBe(0);
  });

  it('measures the distance to the boundary and the worst observation', () => {
    const buffer = findings.find((f) => f.id === 'buffer');
    expect(buffer?.value).toBe(MARGIN);
    const corner = [node(6, 6), node(14, 6), node(6, 14), node(14, 14)].map((n) => grid().observationNode.indexOf(n));
    expect(corner).toContain(figures.predictedBoundaryEffect.variance.observation);
  });
});

describe('a broken mesh', () => {
  it('fails for an element turned over, and shows it', () => {
    const mesh = grid();
    mesh.triangles.set([mesh.triangles[301], mesh.triangles[300]], 300);
    const turned = finding(mesh, 'orientation');
    expect(turned).toMatchObject({ value: 1, verdict: 'fail', place: { elements: [100] }, placeCount: 1 });
    expect(finding(mesh, 'edge-sharing').verdict).toBe('fail');
  });

  it('fails for a node without an element, and shows it', () => {
    const mesh = grid();
    mesh.coordinates = Float64Array.of(...mesh.coordinates, 3.5, 3.25);
    expect(finding(mesh, 'orphan-nodes')).toMatchObject({ value: 1, verdict: 'fail', place: { nodes: [SIZE * SIZE] } });
    expect(finding(mesh, 'positive-diagonals')).toMatchObject({ value: 1, verdict: 'fail' });
    expect(finding(mesh, 'euler-characteristic').verdict).toBe('pass');
  });

  it('fails for a node at the place of another, where the mesh is torn', () => {
    const mesh = grid();
    const copy = mesh.coordinates.length / 2;
    const torn = node(10, 10);
    mesh.coordinates = Float64Array.of(...mesh.coordinates, 10, 10);
    let changed = 0;
    mesh.triangles = mesh.triangles.map((n, h) => (n === torn && h % 2 === 0 && changed++ < 3 ? copy : n));
    expect(finding(mesh, 'duplicate-nodes')).toMatchObject({ value: 1, verdict: 'fail', place: { nodes: [copy] } });
  });

  it('fails for a missing element: one loop too many', () => {
    const mesh = grid();
    mesh.triangles = Uint32Array.from([...mesh.triangles.slice(0, 660), ...mesh.triangles.slice(663)]);
    const loops = finding(mesh, 'boundary-loops');
    expect(loops).toMatchObject({ value: 1, verdict: 'fail', placeCount: 3 });
    expect(finding(mesh, 'euler-characteristic').verdict).toBe('pass');
    expect(check(mesh).figures.boundaryLoops).toBe(2);
  });

  it('fails for pieces that touch in one node only', () => {
    const coordinates = Float64Array.of(0, 0, 1, 0, 0, 1, -1, 0, 0, -1);
    const mesh: CheckedMesh = { crs: 'plane-km', radiusKm: 0, coordinates, triangles: Uint32Array.of(0, 1, 2, 0, 3, 4) };
    expect(finding(mesh, 'euler-characteristic').verdict).toBe('fail');
    expect(finding(mesh, 'euler-characteristic').place.nodes).toEqual([0]);
  });

  it('fails for an observation off the mesh or without a node of its own', () => {
    const mesh = grid();
    mesh.observationNode[3] = mesh.observationNode[2];
    mesh.observationNode[5] = 100_000;
    expect(finding(mesh, 'observations-on-nodes')).toMatchObject({ value: 2, verdict: 'fail', place: { observations: [3, 5] } });
  });

  it('warns of slivers along the boundary and of the positive entries that they make', () => {
    const mesh = grid();
    mesh.coordinates.set([5.5, 0.1], 2 * node(5, 1));
    const sliver = finding(mesh, 'hull-slivers');
    expect(sliver.verdict).toBe('warn');
    expect(sliver.place.elements?.length).toBeGreaterThan(0);
    expect(finding(mesh, 'positive-off-diagonals').verdict).toBe('warn');
    expect(finding(mesh, 'positive-off-diagonals-at-observations').verdict).toBe('pass');
  });

  it('fails for a positive entry at an observation', () => {
    const mesh = grid();
    mesh.coordinates[2 * node(10, 10)] = 10.9;
    expect(finding(mesh, 'positive-off-diagonals-at-observations').verdict).toBe('fail');
  });

  it('judges the smallest angle by its own limits', () => {
    const needle = grid();
    needle.coordinates[2 * node(10, 10)] = 10.99;
    expect(finding(needle, 'smallest-angle').verdict).toBe('warn');
    needle.coordinates[2 * node(10, 10)] = 10.9995;
    expect(finding(needle, 'smallest-angle')).toMatchObject({ verdict: 'fail', unit: 'deg' });
  });

  it('leaves a flat element out of the matrices and says so', () => {
    const mesh = grid();
    mesh.triangles = Uint32Array.of(...mesh.triangles, 0, 1, 2);
    expect(finding(mesh, 'orientation').verdict).toBe('fail');
    expect(finding(mesh, 'mass-symmetry').explanation).toContain('1 elements without area were left out');
  });

  it('refuses coordinates that are not numbers and a mesh without elements', () => {
    const mesh = grid();
    mesh.coordinates[9] = NaN;
    expect(() => check(mesh)).toThrowError(/Coordinate 1 of node 4/);
    expect(() => check({ ...grid(), triangles: new Uint32Array(0) })).toThrowError(/at least one element/);
  });
});

describe('a mesh against its model', () => {
  it('judges the edge length against the Daley length', () => {
    const mean = finding(grid(), 'resolution-largest').value as number;
    expect(mean).toBeGreaterThan(1 / 5);
    expect(mean).toBeLessThan(Math.SQRT2 / 5);
    expect(finding(grid(), 'resolution-largest', { daleyKm: 1.5 }).verdict).toBe('fail');
    expect(finding(grid(), 'resolution-largest', { kind: 'vector' }).verdict).toBe('fail');
    expect(finding(grid(), 'resolution-p95', { daleyKm: 20 }).verdict).toBe('pass');
  });

  it('judges the effect that the normalisation leaves', () => {
    const exact = finding(grid(), 'boundary-effect');
    const theory = finding(grid(), 'boundary-effect', { normalisation: 'theory' });
    expect(exact.title).toContain('correlations');
    expect(theory.title).toContain('variance');
    expect(theory.value as number).toBeGreaterThan(2 * (exact.value as number));
    expect(finding(grid(), 'boundary-effect-other').value).toBe(theory.value);
    expect(theory.verdict).toBe('fail');
    expect(finding(grid(), 'boundary-effect', { normalisation: 'theory', daleyKm: 2 }).verdict).toBe('pass');
  });

  it('takes limits from the policy and refuses an unknown one', () => {
    const own = check(grid(), {}, { 'resolution-p95': { warn: 0.001, fail: 0.002 } }).findings.find((f) => f.id === 'resolution-p95');
    expect(own).toMatchObject({ verdict: 'fail', limit: { direction: 'above', warn: 0.001, fail: 0.002 } });
    expect(() => check(grid(), {}, { nonsense: { warn: 1, fail: 2 } })).toThrowError(/"nonsense", which is no finding/);
  });

  it('takes a mesh made elsewhere, without a map, and judges what it can', () => {
    const { coordinates, triangles } = grid();
    const { findings } = check({ crs: 'plane-km', radiusKm: 0, coordinates, triangles });
    const open = findings.filter((f) => f.verdict === 'not-judged').map((f) => f.id);
    expect(open).toEqual(['boundary-loops', 'observations-on-nodes', 'positive-off-diagonals-at-observations', 'boundary-effect', 'boundary-effect-other', 'buffer']);
    const designed = grid();
    const traced = check({ crs: 'plane-km', radiusKm: 0, coordinates, triangles, observationNode: designed.observationNode });
    expect(traced.figures.predictedBoundaryEffect).toEqual(check(designed).figures.predictedBoundaryEffect);
  });

  it('reports its phases and stops when asked to', () => {
    const phases: string[] = [];
    checkMesh({ mesh: grid(), model, rowsSelected: 1, onPhase: (phase) => phases.push(phase) });
    expect(phases).toEqual(['topology', 'quality', 'assembly', 'boundary', 'findings', 'done']);
    expect(() => checkMesh({ mesh: grid(), model, rowsSelected: 1, isCancelled: () => true })).toThrowError(/cancelled/);
  });
});
