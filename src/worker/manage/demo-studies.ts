import type { Recipe } from '#core/design/recipe.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { Mapping } from '#schemas/observation-sets.ts';

export interface DemoDesign {
  name: string;
  /** What differs from the default recipe. */
  change: Partial<Recipe>;
  /** Saved as versions, in order: with a reason where a finding fails. */
  versions?: { note: string; reason?: string }[];
}

export interface DemoStudy {
  name: string;
  description: string;
  file: string;
  setName: string;
  mapping?: Mapping;
  correlation: Correlation;
  designs: DemoDesign[];
}

const scalar = { kind: 'scalar', mass: 'consistent', normalisation: 'exact', tolerance: 0.01, sphereRadiusKm: 6371 } as const;

/** Synthetic studies of an invented coastal forecasting unit; the files are made by `fixtures/make-demo.ts`. */
export const DEMO_STUDIES: DemoStudy[] = [
  {
    name: 'Radar surface currents',
    description: 'Synthetic. Two shore radars look out from an invented island; a headland hides a wedge from one of them. Does the boundary change the correlations at the edge of the radars’ range?',
    file: 'radar-currents.csv',
    setName: 'Currents, one hour of two radars',
    correlation: { ...scalar, daleyKm: 12, steps: 6 },
    designs: [
      { name: 'Round corners, 1 % tolerance', change: {}, versions: [{ note: 'First version for comparison with the assimilation code.' }] },
      { name: 'Square corners, short buffer', change: { corners: 'square', bufferKm: 20 } },
      { name: 'Too close on purpose', change: { bufferKm: 8 }, versions: [{ note: 'Kept to show what a boundary too close does.', reason: 'Not for use: it documents the boundary effect of a buffer of two thirds of D.' }] },
    ],
  },
  {
    name: 'Ship-track temperatures',
    description: 'Synthetic. Surface temperatures along the legs of an invented research cruise: dense along the track, empty between the legs.',
    file: 'ship-temperatures.tsv',
    setName: 'Temperatures, five legs',
    correlation: { ...scalar, daleyKm: 60, steps: 10, normalisation: 'theory' },
    designs: [
      { name: 'Convex outline', change: {}, versions: [{ note: 'Baseline.' }] },
      { name: 'Box outline', change: { outline: { kind: 'box' }, corners: 'square' } },
    ],
  },
  {
    name: 'Station network',
    description: 'Synthetic. Air temperature at fixed stations in irregular clusters on invented islands; four rows of the file are wrong on purpose and show how rejected rows are listed.',
    file: 'stations.csv',
    setName: 'Stations, one report each',
    correlation: { ...scalar, daleyKm: 80, steps: 4 },
    designs: [{ name: 'Default', change: {}, versions: [{ note: 'Starting point for the network.' }] }],
  },
  {
    name: 'Bay survey',
    description: 'Synthetic. Salinity from a boat survey of an invented bay, in projected coordinates.',
    file: 'bay-survey.csv',
    setName: 'Survey, projected km',
    correlation: { ...scalar, daleyKm: 3, steps: 4, mass: 'lumped' },
    designs: [{ name: 'Plane mesh', change: {} }],
  },
];
