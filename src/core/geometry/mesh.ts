/** `lonlat-deg`: longitude and latitude in degrees on a sphere. `plane-km`: x and y in kilometres. */
export type CoordinateReference = 'lonlat-deg' | 'plane-km';

/** A triangulation: what is hashed, assembled, exported and drawn. */
export interface Mesh {
  crs: CoordinateReference;
  /** Radius of the sphere in km. Ignored (and 0) in the plane. */
  radiusKm: number;
  /** 2 per node: longitude in [-180, 180) and latitude in degrees, or x and y in km. */
  coordinates: Float64Array;
  /** 3 node indices per element, counter-clockwise (on the sphere: seen from outside). */
  triangles: Uint32Array;
}

/** What a node is in the design. Values are stored and exported: never renumber. */
export const NODE_KIND = { observation: 0, core: 1, buffer: 2, boundary: 3, hole: 4 } as const;
export type NodeKind = (typeof NODE_KIND)[keyof typeof NODE_KIND];

/** Node count of a mesh. */
export const nodeCount = (mesh: Mesh): number => mesh.coordinates.length / 2;

/** Element count of a mesh. */
export const elementCount = (mesh: Mesh): number => mesh.triangles.length / 3;
