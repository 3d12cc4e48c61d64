import type { Mesh } from '#core/geometry/mesh.ts';

/** Why a row of the observation set is not an observation of the design. Values are stored: never renumber. */
export const EXCLUSION = {
  none: 0,
  flag: 1,
  timeWindow: 2,
  level: 3,
  outsidePolygon: 4,
  insidePolygon: 5,
  thinned: 6,
} as const;

/** The observations of a design, after selection and the near-observation rule. n observations, N rows. */
export interface SelectedObservations {
  crs: Mesh['crs'];
  /** n longitudes in degrees in [-180, 180), or x in km. */
  x: Float64Array;
  y: Float64Array;
  value?: Float64Array;
  value2?: Float64Array;
  /** Standard deviation, after combining where rows were combined. */
  errorSd?: Float64Array;
  /** Rows behind observation i: `rows[rowStart[i]] .. rows[rowStart[i + 1] - 1]` (n + 1 offsets). */
  rowStart: Uint32Array;
  rows: Uint32Array;
  /** For each of the N rows: an `EXCLUSION` value. */
  exclusion: Uint8Array;
}

/** A convex corner of the outline; a buffer rounded about it focuses the boundary effect there. */
export interface OutlineCorner {
  /** Index of the observation at the corner; -1 where the corner is not an observation (box). */
  observation: number;
  /** Coordinates of the corner. */
  x: number;
  y: number;
  /** Change of direction at the corner, radians, 0 < turning < pi. */
  turning: number;
  /** Whether the boundary is an arc about the corner; squared off otherwise. */
  isRounded: boolean;
}

/** What `buildMesh` returns: the mesh, what each node is, and the boundary it was given. */
export interface DesignedMesh extends Mesh {
  /** `NODE_KIND` per node. */
  nodeKind: Uint8Array;
  /** Selected observation at each node, or -1. */
  nodeObservation: Int32Array;
  /** Node of each selected observation. */
  observationNode: Uint32Array;
  /** Closed loops of node indices, first node not repeated: outer boundaries counter-clockwise, holes clockwise. */
  boundaryLoops: Uint32Array[];
  /**
   * Signed curvature in 1/km of the boundary, its mean along each boundary edge, loop after loop in the order of
   * `boundaryLoops` (edge k of a loop joins its nodes k and k + 1): 0 straight, 1/R on an arc of radius R
   * that bulges out of the domain, negative round a hole.
   */
  boundaryCurvature: Float64Array;
  /** The outline's ring(s), 2 coordinates per vertex, counter-clockwise. */
  outline: Float64Array[];
  outlineCorners: OutlineCorner[];
  /** Clipped-Voronoi spacing (square root of the cell area) at each selected observation, km. */
  localSpacingKm: Float64Array;
  /** Spacing that the core was filled to, km: the recipe's, or derived from `localSpacingKm`. */
  coreSpacingKm: number;
}
