import { describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { cutLoop, cutRing, writeMeshGeoJson } from '#core/formats/geojson-mesh.ts';
import { columnsOf, recipeOf, seeded } from '#support/meshes.ts';

import { failure } from './sample-file.ts';

type Position = [number, number];
interface Feature {
  type: 'Feature';
  geometry: { type: string; coordinates: unknown };
  properties: Record<string, unknown>;
}

/** Signed area of a ring in square degrees: positive when counter-clockwise. */
const shoelace = (ring: Position[]): number => ring.reduce((sum, [x, y], k) => sum + (x * ring[(k + 1) % ring.length][1] - ring[(k + 1) % ring.length][0] * y) / 2, 0);
const areaOf = (rings: Position[][]): number => rings.reduce((sum, ring) => sum + shoelace(ring), 0);
const moved = (ring: Position[], by: number): Position[] => ring.map(([lon, lat]) => [((((lon + by + 180) % 360) + 360) % 360) - 180, lat]);
const inRange = (rings: Position[][]): boolean => rings.flat().every(([lon, lat]) => lon >= -180 && lon <= 180 && lat >= -90 && lat <= 90);

const meshOf = (points: Position[], bufferKm = 300) =>
  runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm }), { sphereRadiusKm: 6371 }).mesh;
const around = (lon: number, lat: number, seed: number): Position[] => {
  const random = seeded(seed);
  return moved(Array.from({ length: 30 }, (): Position => [lon - 4 + 8 * random(), lat - 2 + 4 * random()]), 0);
};
const parsed = (mesh: Parameters<typeof writeMeshGeoJson>[0]): Record<string, unknown> & { features: Feature[] } =>
  JSON.parse(new TextDecoder().decode(writeMeshGeoJson(mesh, { title: 'A mesh' }))) as never;
const ofRole = (features: Feature[], role: string): Feature[] => features.filter(({ properties }) => properties['role'] === role);

// RFC 7946, 3.1.9: what crosses the antimeridian is cut in two, neither part of which crosses it
describe('cutRing', () => {
  const square: Position[] = [[177, -1], [-177, -1], [-177, 1], [177, 1]];

  it('cuts at the antimeridian into counter-clockwise parts of the same area', () => {
    const rings = cutRing(square);
    expect(rings).toHaveLength(2);
    expect(inRange(rings)).toBe(true);
    for (const ring of rings) expect(shoelace(ring)).toBeCloseTo(6, 10);
  });

  it('leaves a ring alone that does not cross, wherever it lies', () => {
    for (const by of [0, 60, -100]) {
      const ring = moved([[10, 0], [14, 0], [12, 5]], by);
      expect(cutRing(ring)).toEqual([ring]);
    }
  });

  it('leaves a ring alone that only touches the antimeridian, on its own side', () => {
    expect(cutRing([[-180, 0], [-170, 0], [-175, 5]])).toEqual([[[-180, 0], [-170, 0], [-175, 5]]]);
    const fromWest = cutRing([[170, 0], [-180, 0], [175, 5]]);
    expect(fromWest).toHaveLength(1);
    expect(fromWest[0].map(([lon]) => lon)).toEqual([170, 180, 175]);
  });

  it('gives the corners of a cut ring back without rounding', () => {
    const corners: Position[] = [[179.123456789012, 1], [-179.7, 2], [-179.000000001, 3.3]];
    const flat = cutRing(corners).flat();
    for (const [lon, lat] of corners) expect(flat.some((p) => p[0] === lon && p[1] === lat)).toBe(true);
  });

  it('closes a ring round a pole along the pole', () => {
    // a ring at 80 degrees encloses 360 x 10 square degrees of the map
    const ring: Position[] = [[-120, 80], [0, 80], [120, 80]];
    const north = cutRing(ring);
    expect(inRange(north)).toBe(true);
    expect(areaOf(north)).toBeCloseTo(3600, 8);
    const south = cutRing(ring.map(([lon, lat]): Position => [-lon, -lat]));
    expect(areaOf(south)).toBeCloseTo(3600, 8);
    expect(Math.min(...south.flat().map(([, lat]) => lat))).toBe(-90);
  });

  it('widens a corner at the pole to the meridians of its neighbours', () => {
    const rings = cutRing([[20, 80], [60, 80], [0, 90]]);
    expect(areaOf(rings)).toBeCloseTo(400, 8);
    expect(areaOf(cutRing([[160, 80], [-160, 80], [0, 90]]))).toBeCloseTo(400, 8);
  });
});

describe('cutLoop', () => {
  it('cuts a closed line at each crossing and loses nothing of it', () => {
    const pieces = cutLoop([[178, -1], [-178, -1], [-178, 1], [178, 1]]);
    expect(inRange(pieces)).toBe(true);
    const length = pieces.reduce((sum, piece) => sum + piece.slice(1).reduce((s, [x, y], k) => s + Math.hypot(x - piece[k][0], y - piece[k][1]), 0), 0);
    expect(length).toBeCloseTo(4 + 2 + 4 + 2, 10);
  });

  it('turns at positions on the antimeridian without repeating them', () => {
    for (const start of [0, 1, 2, 3]) {
      const square: Position[] = [[178, -1], [-180, -2], [-178, 0], [-180, 2]];
      const pieces = cutLoop([...square.slice(start), ...square.slice(0, start)]);
      expect(inRange(pieces)).toBe(true);
      for (const piece of pieces) for (const [k, p] of piece.slice(1).entries()) expect(p).not.toEqual(piece[k]);
      const spans = pieces.map((piece) => Math.max(...piece.map(([lon]) => lon)) - Math.min(...piece.map(([lon]) => lon)));
      expect(Math.max(...spans)).toBeLessThanOrEqual(2);
    }
  });

  it('leaves a line alone that does not cross, closed', () => {
    expect(cutLoop([[1, 1], [2, 1], [2, 2]])).toEqual([[[1, 1], [2, 1], [2, 2], [1, 1]]]);
  });

  it('cuts a line round the pole once', () => {
    const pieces = cutLoop([[-120, 80], [0, 80], [120, 80]]);
    const turns = pieces.reduce((sum, piece) => sum + piece.slice(1).reduce((s, [x], k) => s + x - piece[k][0], 0), 0);
    expect(turns).toBeCloseTo(360, 10);
    expect(inRange(pieces)).toBe(true);
  });
});

describe('writeMeshGeoJson', () => {
  const home = meshOf(around(20, 55, 3));

  it('gives every node as a point with its exact coordinates, kind and observation', () => {
    const { type, title, features } = parsed(home);
    expect([type, title]).toEqual(['FeatureCollection', 'A mesh']);
    const nodes = ofRole(features, 'node');
    expect(nodes.flatMap(({ geometry }) => geometry.coordinates as number[])).toEqual([...home.coordinates]);
    expect(nodes.map(({ properties }) => properties['observation'] ?? -1)).toEqual([...home.nodeObservation]);
    expect(new Set(nodes.map(({ properties }) => properties['kind']))).toEqual(new Set(['observation', 'core', 'buffer', 'boundary'].filter((_, k) => home.nodeKind.includes(k))));
  });

  // RFC 7946, 3.1.6: closed rings of four or more positions, exterior rings counter-clockwise
  it('gives every element as a closed counter-clockwise ring of its nodes', () => {
    const elements = ofRole(parsed(home).features, 'element');
    expect(elements).toHaveLength(home.triangles.length / 3);
    for (const [t, { geometry, properties }] of elements.entries()) {
      expect(geometry.type).toBe('Polygon');
      const [ring] = geometry.coordinates as Position[][];
      expect(ring).toHaveLength(4);
      expect(ring[3]).toEqual(ring[0]);
      expect(shoelace(ring.slice(0, 3))).toBeGreaterThan(0);
      expect(properties['nodes']).toEqual([...home.triangles.slice(3 * t, 3 * t + 3)]);
    }
  });

  it.each([['across the antimeridian', around(180, 55, 3)], ['over the north pole', [[0, 86], [90, 87], [180, 86.5], [-90, 88], [10, 89.9]] as Position[]], ['over the south pole', [[0, -86], [90, -87], [180, -86.5], [-90, -88]] as Position[]]])(
    'cuts elements %s so that the parts tile the same area of the map',
    (_name, points) => {
      const mesh = meshOf(points);
      const { features } = parsed(mesh);
      const rings = ofRole(features, 'element').flatMap(({ geometry }) =>
        geometry.type === 'Polygon' ? [(geometry.coordinates as Position[][])[0]] : (geometry.coordinates as Position[][][]).map(([ring]) => ring),
      );
      expect(inRange(rings)).toBe(true);
      for (const ring of rings) {
        expect(ring.at(-1)).toEqual(ring[0]);
        expect(shoelace(ring)).toBeGreaterThan(0);
        expect(Math.max(...ring.map(([lon]) => lon)) - Math.min(...ring.map(([lon]) => lon))).toBeLessThanOrEqual(360);
      }
      // elements share edges, so that their map areas add up to what the boundary encloses
      const loops = ofRole(features, 'boundary').flatMap(({ geometry }) => geometry.coordinates as Position[][]);
      expect(inRange(loops)).toBe(true);
      const north = mesh.coordinates[1] > 0;
      const pole = north ? 90 : -90;
      // area between a line and the pole's parallel, by trapezoids
      const toPole = loops.reduce((sum, piece) => sum + piece.slice(1).reduce((s, [x, y], k) => s + (x - piece[k][0]) * (pole - (y + piece[k][1]) / 2), 0), 0);
      expect(areaOf(rings)).toBeCloseTo(toPole, 6);
    },
  );

  it('refuses a plane mesh and names the export to use', async () => {
    const { mesh } = runRecipe(columnsOf('plane-km', [[0, 0], [10, 0], [0, 10]]), recipeOf({ bufferKm: 10 }), { sphereRadiusKm: 6371 });
    const error = await failure(() => writeMeshGeoJson(mesh, {}));
    expect(error.message).toContain('plane kilometres. Use the NetCDF export');
  });
});
