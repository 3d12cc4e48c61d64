export type Verdict = 'pass' | 'warn' | 'fail' | 'not-judged';

export type FindingGroup = 'validity' | 'quality' | 'resolution' | 'matrices' | 'boundary';

/** A rule judges in one direction: `above` warns when the value exceeds the limit, `below` when it is less. */
export interface FindingLimit {
  direction: 'above' | 'below';
  warn: number | null;
  fail: number | null;
}

/** Where "show me" flies to; indices are of the checked mesh. */
export interface FindingPlace {
  elements?: number[];
  nodes?: number[];
  /** Indices into the selected observations. */
  observations?: number[];
}

/** One judged figure of a check. */
export interface Finding {
  id: string;
  group: FindingGroup;
  /** Short name in the trade's words. */
  title: string;
  /** null: not judged, and `explanation` says why. */
  value: number | null;
  /** '' for counts and ratios; otherwise 'km', 'deg', '%', 'km²'. Values are in this unit. */
  unit: string;
  limit: FindingLimit;
  verdict: Verdict;
  /** Two sentences: what it protects, what this value means. */
  explanation: string;
  source: string;
  /** At most 200 places, worst first; `placeCount` tells how many there are in all. */
  place: FindingPlace;
  placeCount: number;
}

/** Limits by finding id; absent ids take the defaults of `findings/policy.ts`. */
export type FindingPolicy = Record<string, { warn: number | null; fail: number | null }>;
