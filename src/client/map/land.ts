import type { GeoStream } from 'd3-geo';
import { geoStereographic, geoStream } from 'd3-geo';
import type { MultiPolygon, Polygon } from 'geojson';
import { ShapeUtils, Vector2 } from 'three';
import { feature } from 'topojson-client';
import type { GeometryCollection, Topology } from 'topojson-specification';
import coarseUrl from 'world-atlas/land-110m.json?url';
import fineUrl from 'world-atlas/land-50m.json?url';

import type { DisplayFrame } from './display-projection.ts';
import type { LandBuffers } from './map-scene.ts';

/** Above this reach in degrees the coarse shore lines are drawn. */
const FINE_REACH = 25;

/** Land about the frame's centre, as far as `reachKm` from it, in map kilometres; null in the plane. */
export const loadLand = async (frame: DisplayFrame, reachKm: number): Promise<LandBuffers | null> => {
  if (frame.crs === 'plane-km') return null;
  const reach = (reachKm / frame.radiusKm) * (180 / Math.PI);
  const answer = await fetch(reach > FINE_REACH ? coarseUrl : fineUrl);
  if (!answer.ok) throw new Error(`The land could not be loaded (${answer.status}).`);
  const topology = (await answer.json()) as Topology<{ land: GeometryCollection }>;
  const land = feature(topology, topology.objects.land);
  const polygons = land.features.flatMap(({ geometry }) => (geometry.type === 'MultiPolygon' ? (geometry as MultiPolygon).coordinates : [(geometry as Polygon).coordinates]));
  return projectLand(polygons, frame, Math.min(150, Math.max(12, 3 * reach)));
};

/** Land polygons clipped to a circle about the centre, so that the antimeridian and the poles need no care. */
export const projectLand = (polygons: number[][][][], frame: DisplayFrame, clipDegrees: number): LandBuffers => {
  const [lon, lat] = frame.centre;
  const edge = 2 * frame.radiusKm * Math.tan((clipDegrees * Math.PI) / 360);
  const projection = geoStereographic()
    .rotate([-lon, -lat])
    .scale(2 * frame.radiusKm)
    .translate([0, 0])
    .clipAngle(clipDegrees)
    .precision(edge / 4000);
  const triangles: number[] = [];
  const shore: number[] = [];
  for (const coordinates of polygons) {
    const rings = projectRings({ type: 'Polygon', coordinates }, projection);
    for (const ring of rings) addShore(ring, edge, shore);
    for (const { outer, holes } of nest(rings))
      for (const face of ShapeUtils.triangulateShape(outer, holes)) {
        const all = [outer, ...holes].flat();
        for (const k of face) triangles.push(all[k].x, all[k].y);
      }
  }
  return { triangles: Float32Array.from(triangles), shore: Float32Array.from(shore) };
};

const projectRings = (polygon: Polygon, projection: { stream(sink: GeoStream): GeoStream }): Vector2[][] => {
  const rings: Vector2[][] = [];
  let ring: Vector2[] = [];
  const sink: GeoStream = {
    point: (x, y) => void ring.push(new Vector2(x, -y)),
    lineStart: () => void (ring = []),
    lineEnd: () => {
      const first = ring[0], last = ring[ring.length - 1];
      if (ring.length > 1 && first.equals(last)) ring.pop();
      if (ring.length > 2) rings.push(ring);
    },
    polygonStart: () => {},
    polygonEnd: () => {},
  };
  geoStream(polygon, projection.stream(sink));
  return rings;
};

/** Rings inside another are its holes. */
const nest = (rings: Vector2[][]): { outer: Vector2[]; holes: Vector2[][] }[] => {
  const bySize = rings.map((ring) => ({ ring, area: Math.abs(ShapeUtils.area(ring)) })).sort((a, b) => b.area - a.area);
  const nested: { outer: Vector2[]; holes: Vector2[][] }[] = [];
  for (const { ring } of bySize) {
    const around = nested.find(({ outer }) => contains(outer, ring[0]));
    if (around) around.holes.push(ring);
    else nested.push({ outer: ring, holes: [] });
  }
  return nested;
};

const contains = (ring: Vector2[], { x, y }: Vector2): boolean => {
  let isInside = false;
  for (let i = 0, j = ring.length - 1; i < ring.length; j = i++) {
    const a = ring[i], b = ring[j];
    if (a.y > y !== b.y > y && x < a.x + ((y - a.y) * (b.x - a.x)) / (b.y - a.y)) isInside = !isInside;
  }
  return isInside;
};

/** Shore lines without the stretches along the clipping circle. */
const addShore = (ring: Vector2[], edge: number, shore: number[]): void => {
  const isCut = (p: Vector2): boolean => p.length() > edge * (1 - 1e-6);
  for (let i = 0; i < ring.length; i++) {
    const a = ring[i], b = ring[(i + 1) % ring.length];
    if (isCut(a) && isCut(b)) continue;
    shore.push(a.x, a.y, b.x, b.y);
  }
};
