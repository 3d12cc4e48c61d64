import type { ObservationColumns } from './observations.ts';

const OPTIONAL = ['value', 'value2', 'errorSd', 'time', 'level', 'station', 'flag'] as const;

/** What can be said of an observation set without showing its rows. */
export interface ObservationFacts {
  /** Optional columns that there are. */
  columns: (typeof OPTIONAL)[number][];
  /** Quality flags by falling count; '' stands for rows without one. */
  flags: { name: string; count: number }[];
  /** Smallest box in the set's coordinates; across the antimeridian `west` > `east`. */
  extent: { west: number; south: number; east: number; north: number };
  timeRange: { from: number; to: number } | null;
  levelRange: { min: number; max: number } | null;
}

const rangeOf = (column: Float64Array | undefined): [number, number] | null => {
  let low = Infinity;
  let high = -Infinity;
  for (const value of column ?? []) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  return low <= high ? [low, high] : null;
};

/** West and east of the shortest arc that holds all longitudes. */
const longitudeRange = (lon: Float64Array): [number, number] => {
  const sorted = lon.slice().sort();
  const last = sorted.length - 1;
  let widest = sorted[0] + 360 - sorted[last];
  let range: [number, number] = [sorted[0], sorted[last]];
  for (let k = 0; k < last; k++)
    if (sorted[k + 1] - sorted[k] > widest) {
      widest = sorted[k + 1] - sorted[k];
      range = [sorted[k + 1], sorted[k]];
    }
  return range;
};

/** Facts of a set with at least one row. */
export const observationFacts = (columns: ObservationColumns): ObservationFacts => {
  const [south, north] = rangeOf(columns.y)!;
  const [west, east] = columns.crs === 'lonlat-deg' ? longitudeRange(columns.x) : rangeOf(columns.x)!;
  const time = rangeOf(columns.time);
  const level = rangeOf(columns.level);
  const counts = new Map<string, number>();
  if (columns.flag) for (const code of columns.flag.codes) counts.set(columns.flag.names[code], (counts.get(columns.flag.names[code]) ?? 0) + 1);
  return {
    columns: OPTIONAL.filter((name) => columns[name] !== undefined),
    flags: [...counts].map(([name, count]) => ({ name, count })).sort((a, b) => b.count - a.count || (a.name < b.name ? -1 : 1)),
    extent: { west, south, east, north },
    timeRange: time && { from: time[0], to: time[1] },
    levelRange: level && { min: level[0], max: level[1] },
  };
};
