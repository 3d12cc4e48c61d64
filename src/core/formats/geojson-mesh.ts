import { NODE_KIND } from '#core/geometry/mesh.ts';
import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { NumericalError } from '#core/errors.ts';

type Position = [number, number];

const KIND_NAMES = Object.fromEntries(Object.entries(NODE_KIND).map(([name, value]) => [value, name]));

/** Longitudes made continuous along the ring; a pole takes the longitude of either neighbour in turn. */
const unwrap = (ring: Position[]): Position[] => {
  const out: Position[] = [];
  for (const [k, [lon, lat]] of ring.entries()) {
    if (Math.abs(lat) === 90) {
      const before = ring[(k + ring.length - 1) % ring.length];
      const after = ring[(k + 1) % ring.length];
      for (const [neighbour] of [before, after]) out.push([near(neighbour, out.at(-1)?.[0] ?? neighbour), lat]);
      continue;
    }
    out.push([near(lon, out.at(-1)?.[0] ?? lon), lat]);
  }
  return out;
};

/** The angle equal to `lon` within 180 degrees of `reference`. */
const near = (lon: number, reference: number): number => {
  let turned = lon;
  while (turned - reference > 180) turned -= 360;
  while (turned - reference < -180) turned += 360;
  return turned;
};

/** The part of a convex ring on one side of a meridian. */
const clip = (ring: Position[], meridian: number, keepWest: boolean): Position[] => {
  const inside = ([lon]: Position): boolean => (keepWest ? lon <= meridian : lon >= meridian);
  const out: Position[] = [];
  for (const [k, a] of ring.entries()) {
    const b = ring[(k + 1) % ring.length];
    if (inside(a)) out.push(a);
    if (inside(a) !== inside(b) && a[0] !== b[0] && a[0] !== meridian && b[0] !== meridian) {
      const t = (meridian - a[0]) / (b[0] - a[0]);
      out.push([meridian, a[1] + t * (b[1] - a[1])]);
    }
  }
  return out.length >= 3 ? out : [];
};

const shift = (ring: Position[], by: number): Position[] => ring.map(([lon, lat]) => [lon + by, lat]);
const close = (ring: Position[]): Position[] => [...ring, ring[0]];

/** Rings of a convex polygon on the sphere, cut at the antimeridian (RFC 7946, 3.1.9), longitudes in [-180, 180]. */
export const cutRing = (ring: Position[]): Position[][] => {
  let flat = unwrap(ring);
  const last = flat[flat.length - 1];
  const winding = near(flat[0][0], last[0]) - flat[0][0];
  if (Math.abs(winding) > 180) {
    // the ring goes round a pole: close it along the pole, one turn on
    const pole = winding > 0 ? 90 : -90;
    const turned: Position = [flat[0][0] + winding, flat[0][1]];
    flat = [...flat, turned, [turned[0], pole], [flat[0][0], pole]];
  }
  const west = Math.min(...flat.map(([lon]) => lon));
  const east = Math.max(...flat.map(([lon]) => lon));
  const rings: Position[][] = [];
  for (let turn = Math.floor((west + 180) / 360); turn <= Math.ceil((east + 180) / 360) - 1; turn++) {
    const from = 360 * turn - 180;
    const part = clip(clip(flat, from, false), from + 360, true);
    if (part.length >= 3) rings.push(shift(part, -360 * turn));
  }
  return rings.length > 0 ? rings : [shift(flat, -360 * Math.floor((west + 180) / 360))];
};

/** A closed line cut at the antimeridian: pieces with longitudes in [-180, 180]. */
export const cutLoop = (ring: Position[]): Position[][] => {
  const flat = unwrap(ring);
  flat.push([near(flat[0][0], flat[flat.length - 1][0]), flat[0][1]]);
  const turnOf = (lon: number): number => Math.floor((lon + 180) / 360);
  const pieces: Position[][] = [];
  let piece: Position[] = [];
  let turn = turnOf((flat[0][0] + flat[1][0]) / 2);
  for (const [k, [lon, lat]] of flat.entries()) {
    piece.push([lon - 360 * turn, lat]);
    const next = flat[k + 1];
    if (!next) break;
    const nextTurn = next[0] > lon ? Math.max(turn, Math.ceil((next[0] + 180) / 360) - 1) : next[0] < lon ? Math.min(turn, turnOf(next[0])) : turn;
    if (nextTurn === turn) continue;
    const meridian = 360 * Math.max(turn, nextTurn) - 180;
    const at = lat + ((meridian - lon) / (next[0] - lon)) * (next[1] - lat);
    piece.push([meridian - 360 * turn, at]);
    pieces.push(piece);
    piece = [[meridian - 360 * nextTurn, at]];
    turn = nextTurn;
  }
  pieces.push(piece);
  return pieces.filter((one) => one.length >= 2);
};

/**
 * A mesh on the sphere as GeoJSON (RFC 7946): a point per node, a polygon per element (counter-clockwise, cut at the
 * antimeridian), outline and boundary as lines. Indices count from 0. `members` are added to the collection.
 * @throws NumericalError FILE_FORMAT_UNKNOWN for a plane mesh: GeoJSON holds longitude and latitude only
 */
export const writeMeshGeoJson = (mesh: DesignedMesh, members: Record<string, unknown>): Uint8Array => {
  if (mesh.crs !== 'lonlat-deg')
    throw new NumericalError('FILE_FORMAT_UNKNOWN', 'GeoJSON holds longitudes and latitudes, and this mesh is in plane kilometres. Use the NetCDF export.');
  const c = mesh.coordinates;
  const at = (i: number): Position => [c[2 * i], c[2 * i + 1]];
  const feature = (geometry: unknown, properties: unknown): string => JSON.stringify({ type: 'Feature', geometry, properties });
  const lines = (rings: Position[][], role: string): string => feature({ type: 'MultiLineString', coordinates: rings.flatMap(cutLoop) }, { role });
  const features: string[] = [];
  features.push(lines(mesh.outline.map((ring) => Array.from({ length: ring.length / 2 }, (_, k): Position => [ring[2 * k], ring[2 * k + 1]])), 'outline'));
  features.push(lines(mesh.boundaryLoops.map((loop) => Array.from(loop, at)), 'boundary'));
  for (let i = 0; i < mesh.nodeKind.length; i++)
    features.push(
      feature({ type: 'Point', coordinates: at(i) }, { role: 'node', node: i, kind: KIND_NAMES[mesh.nodeKind[i]], observation: mesh.nodeObservation[i] < 0 ? null : mesh.nodeObservation[i] }),
    );
  for (let t = 0; t < mesh.triangles.length; t += 3) {
    const nodes = [mesh.triangles[t], mesh.triangles[t + 1], mesh.triangles[t + 2]];
    const rings = cutRing(nodes.map(at)).map((ring) => [close(ring)]);
    const geometry = rings.length === 1 ? { type: 'Polygon', coordinates: rings[0] } : { type: 'MultiPolygon', coordinates: rings };
    features.push(feature(geometry, { role: 'element', element: t / 3, nodes }));
  }
  const encoder = new TextEncoder();
  const head = JSON.stringify({ type: 'FeatureCollection', ...members });
  const parts: Uint8Array[] = [encoder.encode(`${head.slice(0, -1)},"features":[\n`)];
  for (let k = 0; k < features.length; k += 20_000) {
    const isLast = k + 20_000 >= features.length;
    parts.push(encoder.encode(features.slice(k, k + 20_000).join(',\n') + (isLast ? '\n]}\n' : ',\n')));
  }
  const bytes = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let offset = 0;
  for (const part of parts) {
    bytes.set(part, offset);
    offset += part.length;
  }
  return bytes;
};
