import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';

/** What a display projection is made from; plain data, so that the worker and the page make the same one. */
export interface DisplayFrame {
  crs: CoordinateReference;
  /** Centre of the map: degrees, or km in the plane. */
  centre: [number, number];
  radiusKm: number;
}

/** From coordinates to map kilometres (x right, y up) about the frame's centre, and back. */
export interface DisplayProjection {
  frame: DisplayFrame;
  forward(x: number, y: number): [number, number];
  inverse(mapX: number, mapY: number): [number, number];
  /** Map kilometres of pairs of coordinates. */
  project(coordinates: Float64Array): Float32Array;
  /** Map kilometres per kilometre on the ground. */
  scaleAt(mapX: number, mapY: number): number;
}

/** A frame centred on points: on the sphere at their mean direction, in the plane at the middle of their box. */
export const frameOf = (crs: CoordinateReference, x: ArrayLike<number>, y: ArrayLike<number>, radiusKm: number): DisplayFrame => {
  const count = x.length;
  if (crs === 'plane-km') {
    let west = Infinity, east = -Infinity, south = Infinity, north = -Infinity;
    for (let i = 0; i < count; i++) {
      west = Math.min(west, x[i]);
      east = Math.max(east, x[i]);
      south = Math.min(south, y[i]);
      north = Math.max(north, y[i]);
    }
    return { crs, centre: count === 0 ? [0, 0] : [(west + east) / 2, (south + north) / 2], radiusKm };
  }
  let sx = 0, sy = 0, sz = 0;
  for (let i = 0; i < count; i++) {
    const lon = (x[i] * Math.PI) / 180, lat = (y[i] * Math.PI) / 180;
    sx += Math.cos(lat) * Math.cos(lon);
    sy += Math.cos(lat) * Math.sin(lon);
    sz += Math.sin(lat);
  }
  const flat = Math.hypot(sx, sy);
  if (flat + Math.abs(sz) < 1e-6 * count) return { crs, centre: [0, 0], radiusKm };
  return { crs, centre: [(Math.atan2(sy, sx) * 180) / Math.PI, (Math.atan2(sz, flat) * 180) / Math.PI], radiusKm };
};

export const createDisplayProjection = (frame: DisplayFrame): DisplayProjection => {
  const [cx, cy] = frame.centre;
  if (frame.crs === 'plane-km')
    return {
      frame,
      forward: (x, y) => [x - cx, y - cy],
      inverse: (mapX, mapY) => [mapX + cx, mapY + cy],
      project(coordinates) {
        const out = new Float32Array(coordinates.length);
        for (let k = 0; k < out.length; k += 2) {
          out[k] = coordinates[k] - cx;
          out[k + 1] = coordinates[k + 1] - cy;
        }
        return out;
      },
      scaleAt: () => 1,
    };
  const stereographic = createStereographic(cx, cy, frame.radiusKm);
  const pair = new Float64Array(2);
  return {
    frame,
    forward(x, y) {
      stereographic.forward(x, y, pair, 0);
      return [pair[0], pair[1]];
    },
    inverse(mapX, mapY) {
      stereographic.inverse(mapX, mapY, pair, 0);
      return [pair[0], pair[1]];
    },
    project(coordinates) {
      const out = new Float32Array(coordinates.length);
      for (let k = 0; k < out.length; k += 2) {
        stereographic.forward(coordinates[k], coordinates[k + 1], pair, 0);
        out[k] = pair[0];
        out[k + 1] = pair[1];
      }
      return out;
    },
    scaleAt: stereographic.scaleAt,
  };
};
