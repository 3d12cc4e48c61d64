/** Longitude/latitude in degrees or x/y in km, in the observation set's own coordinates. */
export type Position = [number, number];

/** One ring, not closed: the last position differs from the first. */
export type Ring = Position[];

export interface NearRule {
  /** Observations closer than this are treated as one place, km. 0: only exactly coincident ones. */
  km: number;
  /** combine: inverse-variance mean; thin: keep one by the stated rule; refuse: an error names the pairs. */
  rule: 'combine' | 'thin' | 'refuse';
}

export interface Selection {
  /** Quality flags to keep; absent: all. The empty string stands for rows without a flag. */
  flags?: string[];
  /** Seconds since 1970-01-01T00:00:00Z, both ends included. */
  timeWindow?: { from: number; to: number };
  /** Both ends included. */
  level?: { min: number; max: number };
  near: NearRule;
  keepInside?: Ring;
  leaveOut?: Ring;
}

export type Outline = { kind: 'convex' } | { kind: 'box' };

/** Everything that decides a mesh apart from the observations: the same recipe gives the same bytes. */
export interface Recipe {
  selection: Selection;
  outline: Outline;
  /** Distance on the ground from the outline to the outer boundary, km. */
  bufferKm: number;
  corners: 'round' | 'square';
  /** Target edge length inside the outline, km; absent: derived from the observations' local spacing. */
  coreSpacingKm?: number;
  /** Largest ratio between neighbouring edge lengths from the core outwards, 1.05 to 3. */
  growth: number;
}
