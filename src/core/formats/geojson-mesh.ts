import { NODE_KIND } from '#core/geometry/mesh.ts';
import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { NumericalError } from '#core/errors.ts';

type Position = [number, number];

const KIND_NAMES = Object.fromEntries(Object.entries(NODE_KIND).map(([name, value]) => [value, name]));

/** A position whose longitude may lie turns away from [-180, 180]; `exact` is the longitude it was given with. */
interface Turned {
  lon: number;
  lat: number;
  exact?: number;
}

/** Longitudes made continuous along the ring; a pole takes the longitude of either neighbour in turn. */
const unwrap = (ring: Position[]): Turned[] => {
  const out: Turned[] = [];
  for (const [k, [lon, lat]] of ring.entries()) {
    if (Math.abs(lat) === 90) {
      const before = ring[(k + ring.length - 1) % ring.length];
      const after = ring[(k + 1) % ring.length];
      for (const [neighbour] of [before, after]) out.push({ lon: near(neighbour, out.at(-1)?.lon ?? neighbour), lat });
      continue;
    }
    out.push({ lon: near(lon, out.at(-1)?.lon ?? lon), lat, exact: lon });
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
const clip = (ring: Turned[], meridian: number, keepWest: boolean): Turned[] => {
  const inside = ({ lon }: Turned): boolean => (keepWest ? lon <= meridian : lon >= meridian);
  const out: Turned[] = [];
  for (const [k, a] of ring.entries()) {
    const b = ring[(k + 1) % ring.length];
    if (inside(a)) out.push(a);
    if (inside(a) !== inside(b) && a.lon !== meridian && b.lon !== meridian) out.push({ lon: meridian, lat: latitudeAt(meridian, a, b) });
  }
  return out.length >= 3 ? out : [];
};

/** Where the straight line in longitude and latitude from a to b meets a meridian. */
const latitudeAt = (meridian: number, a: Turned, b: Turned): number => a.lat + ((meridian - a.lon) / (b.lon - a.lon)) * (b.lat - a.lat);

/** Turned back by `turns`; turning to and fro rounds, so a given longitude comes out as it was given. */
const turnBack = ({ lon, lat, exact }: Turned, turns: number): Position => {
  const turned = lon - 360 * turns;
  return [exact !== undefined && Math.abs(exact - turned) < 1e-9 ? exact : turned, lat];
};

const close = (ring: Position[]): Position[] => [...ring, ring[0]];

/** Rings of a convex polygon on the sphere, cut at the antimeridian (RFC 7946, 3.1.9), longitudes in [-180, 180]. */
export const cutRing = (ring: Position[]): Position[][] => {
  let flat = unwrap(ring);
  const [first] = flat;
  const winding = near(first.lon, flat[flat.length - 1].lon) - first.lon;
  if (Math.abs(winding) > 180) {
    // the ring goes round a pole: close it along the pole, one turn on
    const pole = winding > 0 ? 90 : -90;
    const lon = first.lon + winding;
    flat = [...flat, { ...first, lon }, { lon, lat: pole }, { lon: first.lon, lat: pole }];
  }
  const longitudes = flat.map(({ lon }) => lon);
  const west = Math.min(...longitudes);
  const east = Math.max(...longitudes);
  const rings: Position[][] = [];
  for (let turn = Math.floor((west + 180) / 360); turn <= Math.ceil((east + 180) / 360) - 1; turn++) {
    const from = 360 * turn - 180;
    const part = clip(clip(flat, from, false), from + 360, true);
    if (part.length >= 3) rings.push(part.map((position) => turnBack(position, turn)));
  }
  return rings.length > 0 ? rings : [flat.map((position) => turnBack(position, Math.floor((west + 180) / 360)))];
};

/** A closed line cut at the antimeridian: pieces with longitudes in [-180, 180]. */
export const cutLoop = (ring: Position[]): Position[][] => {
  const flat = unwrap(ring);
  flat.push({ ...flat[0], lon: near(flat[0].lon, flat[flat.length - 1].lon) });
  const turnOf = (lon: number): number => Math.floor((lon + 180) / 360);
  const pieces: Position[][] = [];
  let piece: Position[] = [];
  // a start on the meridian belongs to the side that the line goes to
  let turn = turnOf(flat[0].lon) - (turnOf(flat[0].lon) * 360 - 180 === flat[0].lon && flat[1].lon < flat[0].lon ? 1 : 0);
  for (const [k, here] of flat.entries()) {
    piece.push(turnBack(here, turn));
    const next = flat[k + 1];
    if (!next) break;
    const nextTurn = next.lon > here.lon ? Math.max(turn, Math.ceil((next.lon + 180) / 360) - 1) : next.lon < here.lon ? Math.min(turn, turnOf(next.lon)) : turn;
    if (nextTurn === turn) continue;
    const meridian = 360 * Math.max(turn, nextTurn) - 180;
    const lat = latitudeAt(meridian, here, next);
    if (here.lon !== meridian) piece.push([meridian - 360 * turn, lat]);
    pieces.push(piece);
    piece = [[meridian - 360 * nextTurn, lat]];
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
