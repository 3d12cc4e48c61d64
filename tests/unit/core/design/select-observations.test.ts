import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { EXCLUSION } from '#core/design/designed-mesh.ts';
import type { ObservationColumns } from '#core/design/observations.ts';
import type { Ring, Selection } from '#core/design/recipe.ts';
import { selectObservations } from '#core/design/select-observations.ts';
import { NumericalError } from '#core/errors.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';

const R = 6371;

type Row = [x: number, y: number, sd?: number, value?: number];

const setOf = (crs: CoordinateReference, rows: Row[], more: Partial<ObservationColumns> = {}): ObservationColumns => ({
  crs,
  x: Float64Array.from(rows, ([x]) => x),
  y: Float64Array.from(rows, ([, y]) => y),
  line: Uint32Array.from(rows, (_, i) => i + 2),
  ...(rows.some((row) => row.length > 2) && { errorSd: Float64Array.from(rows, ([, , sd]) => sd ?? NaN) }),
  ...(rows.some((row) => row.length > 3) && { value: Float64Array.from(rows, ([, , , value]) => value ?? NaN) }),
  ...more,
});

const select = (columns: ObservationColumns, selection: Partial<Selection> = {}) =>
  selectObservations(columns, { near: { km: 0, rule: 'combine' }, ...selection }, { sphereRadiusKm: R });

const rowsOf = ({ rowStart, rows }: ReturnType<typeof select>): number[][] =>
  Array.from({ length: rowStart.length - 1 }, (_, i) => [...rows.subarray(rowStart[i], rowStart[i + 1])]);

const failureOf = (call: () => unknown): NumericalError => {
  try {
    call();
  } catch (error) {
    if (error instanceof NumericalError) return error;
    throw error;
  }
  throw new Error('The call succeeded.');
};

/** Great-circle distance by the haversine formula (Sinnott 1984), with the platform's functions. */
const distanceKm = (crs: CoordinateReference, ax: number, ay: number, bx: number, by: number): number => {
  if (crs === 'plane-km') return Math.hypot(ax - bx, ay - by);
  const rad = Math.PI / 180;
  const h = Math.sin(((by - ay) * rad) / 2) ** 2 + Math.cos(ay * rad) * Math.cos(by * rad) * Math.sin(((bx - ax) * rad) / 2) ** 2;
  return 2 * R * Math.asin(Math.min(1, Math.sqrt(h)));
};

describe('selection by attributes', () => {
  const columns = setOf('plane-km', [[0, 0], [1, 0], [2, 0], [3, 0], [4, 0]], {
    flag: { names: ['good', 'bad', ''], codes: new Uint32Array([0, 1, 0, 2, 0]) },
    time: new Float64Array([10, 20, 30, 40, NaN]),
    level: new Float64Array([NaN, 0, 5, 10, 15]),
  });

  it('keeps rows by flag, the empty string standing for none', () => {
    const { rows, exclusion } = select(columns, { flags: ['good', ''] });
    expect([...rows]).toEqual([0, 2, 3, 4]);
    expect([...exclusion]).toEqual([0, EXCLUSION.flag, 0, 0, 0]);
  });

  it('keeps rows inside windows, ends included, and drops those without a time or level', () => {
    expect([...select(columns, { timeWindow: { from: 20, to: 40 } }).rows]).toEqual([1, 2, 3]);
    expect([...select(columns, { level: { min: 0, max: 10 } }).rows]).toEqual([1, 2, 3]);
  });

  it('notes the first reason only', () => {
    const { exclusion } = select(columns, { flags: ['good'], timeWindow: { from: 10, to: 30 }, level: { min: 5, max: 5 } });
    expect([...exclusion]).toEqual([EXCLUSION.level, EXCLUSION.flag, 0, EXCLUSION.flag, EXCLUSION.timeWindow]);
  });

  it('counts the reasons when nothing is left', () => {
    const error = failureOf(() => select(columns, { flags: ['good'], timeWindow: { from: 0, to: 1 } }));
    expect(error.code).toBe('SELECTION_EMPTY');
    expect(error.message).toBe('The selection leaves no observation of 5 rows: 2 by their quality flag, 3 by the time window. Widen the selection.');
    expect(error.details).toMatchObject({ rows: 5, flag: 2, timeWindow: 3, level: 0 });
    const plain = setOf('plane-km', [[0, 0]]);
    expect(failureOf(() => select(plain, { level: { min: 0, max: 1 } })).message).toMatch(/no such column/);
  });

  it.each<[Partial<Selection>, string]>([
    [{ near: { km: -1, rule: 'thin' } }, 'near.km'],
    [{ near: { km: NaN, rule: 'thin' } }, 'near.km'],
    [{ timeWindow: { from: 2, to: 1 } }, 'timeWindow'],
    [{ level: { min: 2, max: 1 } }, 'level'],
  ])('refuses the impossible recipe %j', (selection, field) => {
    const error = failureOf(() => select(columns, selection));
    expect([error.code, error.details.field]).toEqual(['RECIPE_INVALID', field]);
  });
});

describe('selection by polygon', () => {
  const keptBy = (crs: CoordinateReference, ring: Ring, points: [number, number][]): boolean[] => {
    const columns = setOf(crs, [...points, [0.125, 0.125]]);
    try {
      const { exclusion } = select(columns, { keepInside: ring });
      return points.map((_, i) => exclusion[i] === EXCLUSION.none);
    } catch {
      return points.map(() => false);
    }
  };

  it('keeps inside and leaves out, edges counting as inside', () => {
    const square: Ring = [[0, 0], [2, 0], [2, 2], [0, 2]];
    const columns = setOf('plane-km', [[1, 1], [2, 1], [0, 0], [3, 1], [1, 2.0000001]]);
    expect([...select(columns, { keepInside: square }).exclusion]).toEqual([0, 0, 0, EXCLUSION.outsidePolygon, EXCLUSION.outsidePolygon]);
    expect([...select(columns, { leaveOut: square }).exclusion]).toEqual([5, 5, 5, 0, 0]);
  });

  it('agrees with the winding of a star-shaped ring about points off its edges', () => {
    const star = fc.array(fc.double({ min: 1, max: 5, noNaN: true }), { minLength: 3, maxLength: 40 });
    fc.assert(
      fc.property(star, fc.array(fc.tuple(fc.double({ min: -6, max: 6, noNaN: true }), fc.double({ min: -6, max: 6, noNaN: true })), { maxLength: 20 }), (radii, points) => {
        const ring: Ring = radii.map((r, k) => [r * Math.cos((2 * Math.PI * k) / radii.length), r * Math.sin((2 * Math.PI * k) / radii.length)]);
        const kept = keptBy('plane-km', ring, points);
        for (const [i, [x, y]] of points.entries()) {
          let angle = 0;
          for (const [k, [ax, ay]] of ring.entries()) {
            const [bx, by] = ring[(k + 1) % ring.length];
            angle += Math.atan2((ax - x) * (by - y) - (ay - y) * (bx - x), (ax - x) * (bx - x) + (ay - y) * (by - y));
          }
          if (Math.abs(Math.abs(angle) - Math.PI) > 1e-3) expect(kept[i]).toBe(Math.abs(angle) > Math.PI);
        }
      }),
    );
  });

  it('crosses the antimeridian the shorter way', () => {
    const ring: Ring = [[170, -10], [-170, -10], [-170, 10], [170, 10]];
    expect(keptBy('lonlat-deg', ring, [[175, 0], [-175, 0], [-180, 10], [0, 0], [165, 0], [-165, 0]])).toEqual([true, true, true, false, false, false]);
    const turned: Ring = ring.map(([lon, lat]) => [lon < 0 ? lon + 360 : lon, lat]);
    expect(keptBy('lonlat-deg', turned, [[175, 0], [-175, 0], [0, 0]])).toEqual([true, true, false]);
  });

  it('takes an edge along a parallel as the parallel (RFC 7946 section 3.1.1)', () => {
    const box: Ring = [[0, 40], [80, 40], [80, 60], [0, 60]];
    expect(keptBy('lonlat-deg', box, [[40, 60], [40, 60.001], [40, 40.001], [40, 39.999]])).toEqual([true, false, true, false]);
  });

  it('holds the pole that it goes round', () => {
    const cap: Ring = [[0, 60], [120, 60], [-120, 60]];
    expect(keptBy('lonlat-deg', cap, [[10, 90], [-77, 89], [33, 60], [33, 59.9], [0, -90]])).toEqual([true, true, true, false, false]);
    const south: Ring = [[-90, -70], [0, -65], [90, -70], [-180, -65]];
    expect(keptBy('lonlat-deg', south, [[45, -90], [45, -80], [45, -60], [0, 90]])).toEqual([true, true, false, false]);
  });

  it.each<[Ring, RegExp]>([
    [[[0, 0], [1, 0], [0, 0]], /2 different corners/],
    [[[0, 0], [1, NaN], [0, 1]], /corner 2/],
    [[[0, 0], [1, 91], [0, 1]], /corner 2.*±90/],
    [[[-90, 0], [90, 0], [90, 10], [-90, 10]], /spans 180.*corner 1 to corner 2/],
    [[[-180, 0], [180, 0], [180, 10], [-180, 10]], /spans 360/],
  ])('refuses the ring %j', (keepInside, says) => {
    const error = failureOf(() => select(setOf('lonlat-deg', [[0, 0]]), { keepInside }));
    expect(error.code).toBe('POLYGON_INVALID');
    expect(error.message).toMatch(says);
  });
});

describe('observations in one place', () => {
  // inverse-variance weighting: mean = Σ(x/s²)/Σ(1/s²), variance 1/Σ(1/s²) (Bevington & Robinson 2003, section 4.1)
  it('are combined by the inverse-variance mean', () => {
    const { value, errorSd, x } = select(setOf('plane-km', [[1, 2, 1, 10], [1, 2, 2, 20], [5, 5, 3, 7]]));
    expect([...x]).toEqual([1, 5]);
    expect(value?.[0]).toBeCloseTo((10 / 1 + 20 / 4) / (1 / 1 + 1 / 4), 14);
    expect(errorSd?.[0]).toBeCloseTo(1 / Math.sqrt(1 / 1 + 1 / 4), 14);
    expect([value?.[1], errorSd?.[1]]).toEqual([7, 3]);
  });

  it('give an unweighted mean without standard deviation where one has none', () => {
    const { value, errorSd } = select(setOf('plane-km', [[0, 0, 1, 10], [0, 0, undefined, 20], [0, 0, 3, NaN]]));
    expect(value?.[0]).toBe(15);
    expect(errorSd?.[0]).toBeNaN();
  });

  it('keep their formula for standard deviations of any size', () => {
    const { errorSd } = select(setOf('plane-km', [[0, 0, 1e-200, 1], [0, 0, 1e-200, 2], [9, 9, 1e200, 1], [9, 9, 1e200, 1]]));
    expect(errorSd?.[0]).toBeCloseTo(1e-200 / Math.SQRT2, 210);
    expect((errorSd?.[1] ?? 0) / 1e200).toBeCloseTo(Math.SQRT1_2, 14);
  });

  it('count as one place at a pole whatever the longitude, and nowhere else nearer than equal', () => {
    const { x, y, rowStart } = select(setOf('lonlat-deg', [[10, 90], [-170, 90], [0, -90], [0, 89.99999999999], [5, 5], [5 + 1e-15, 5], [-0, 0], [0, -0]]));
    expect([...y]).toEqual([90, -90, 89.99999999999, 5, 5, 0]);
    expect(x[0]).toBe(10);
    expect([...rowStart]).toEqual([0, 2, 3, 4, 5, 6, 8]);
  });
});

describe('near observations', () => {
  it('are thinned to the most precise, then the first', () => {
    const columns = setOf('plane-km', [[0, 0, 2], [0.5, 0, 1], [1.4, 0, 1], [5, 0, 1], [5, 0.1, 1], [9, 9, NaN], [9, 9.2, 50]]);
    const { rows, exclusion } = select(columns, { near: { km: 1, rule: 'thin' } });
    expect([...rows]).toEqual([1, 3, 6]);
    expect([...exclusion]).toEqual([6, 0, 6, 0, 6, 6, 0]);
  });

  it('are refused with their lines', () => {
    const columns = setOf('lonlat-deg', [[0, 0], [10, 0], [0.001, 0], [10, 0.001], [20, 0]]);
    const error = failureOf(() => select(columns, { near: { km: 1, rule: 'refuse' } }));
    expect(error.code).toBe('POINTS_TOO_CLOSE');
    expect(error.message).toMatch(/^2 observations lie closer than 1 km to another one: lines 2 and 4, 3 and 5\. Combine or thin/);
    expect(error.details).toEqual({ km: 1, count: 2, pairs: [[2, 4], [3, 5]] });
    expect(select(columns, { near: { km: 0.1, rule: 'refuse' } }).x.length).toBe(5);
  });

  it('are combined at the weighted mean position', () => {
    const plane = select(setOf('plane-km', [[0, 0, 1], [1, 0, 0.5]]), { near: { km: 2, rule: 'combine' } });
    expect(plane.x[0]).toBeCloseTo(0.8, 14);
    const { x, y } = select(setOf('lonlat-deg', [[179.95, 0], [-179.95, 0]]), { near: { km: 20, rule: 'combine' } });
    expect([x[0], y[0]]).toEqual([-180, 0]);
    const polar = select(setOf('lonlat-deg', [[0, 89.99], [90, 89.99], [-180, 89.99], [-90, 89.99]]), { near: { km: 5, rule: 'combine' } });
    expect(polar.y[0]).toBeCloseTo(90, 10);
  });

  it('are combined again where their means come too near, until they keep their distance', () => {
    const row = (x: number): Row => [x, 0];
    // round 1: means 0.3675 and 0.6325; round 2: the mean of all eight
    const columns = setOf('plane-km', [0, 1, 0.49, 0.49, 0.49, 0.51, 0.51, 0.51, 20].map(row));
    expect([...select(columns, { near: { km: 1, rule: 'combine' } }).x]).toEqual([expect.closeTo(0.5, 12), 20]);
    const chained = setOf('plane-km', [0, 1, 0.49, 0.49, 0.49, 0.51, 0.51, 0.51, -0.45, -0.45, -0.45, -0.45, -1.2].map(row));
    const { x, rowStart } = select(chained, { near: { km: 1, rule: 'combine' } });
    expect(rowStart.length - 1).toBe(x.length);
    for (let i = 1; i < x.length; i++) expect(Math.abs(x[i] - x[0])).toBeGreaterThanOrEqual(1);
  });

  it('leave a linear field as it is', () => {
    const field = (x: number, y: number): number => 3 + 0.5 * x - 2 * y;
    const rows: Row[] = Array.from({ length: 300 }, (_, k) => {
      const x = (k * 0.618) % 1;
      const y = (k * 0.414) % 1;
      return [10 * x, 10 * y, 1 + (k % 7), field(10 * x, 10 * y)];
    });
    const { x, y, value } = select(setOf('plane-km', rows), { near: { km: 2, rule: 'combine' } });
    expect(x.length).toBeLessThan(60);
    for (const [i, v] of (value ?? new Float64Array()).entries()) expect(v).toBeCloseTo(field(x[i], y[i]), 10);
  });

  const cloud = (crs: CoordinateReference): fc.Arbitrary<ObservationColumns> => {
    const wide = crs === 'lonlat-deg' ? fc.double({ min: -180, max: 179.999, noNaN: true }) : fc.double({ min: -500, max: 500, noNaN: true });
    const tall = crs === 'lonlat-deg' ? fc.oneof(fc.constantFrom(-90, 90), fc.double({ min: -90, max: 90, noNaN: true })) : wide;
    const close = fc.tuple(fc.double({ min: -1, max: 1, noNaN: true }), fc.double({ min: -1, max: 1, noNaN: true }));
    const sd = fc.option(fc.double({ min: 0.01, max: 10, noNaN: true }), { nil: NaN });
    const row = fc.tuple(fc.oneof(close, fc.tuple(wide, tall)), sd).map(([[x, y], s]): Row => [x, y, s]);
    return fc.array(row, { minLength: 1, maxLength: 60 }).map((rows) => setOf(crs, rows));
  };
  const km = fc.constantFrom(0, 1e-6, 0.5, 10, 100, 1000, 25_000);

  it.each<CoordinateReference>(['plane-km', 'lonlat-deg'])('end at least the distance apart (%s), every row accounted for', (crs) => {
    fc.assert(
      fc.property(cloud(crs), km, fc.constantFrom('combine' as const, 'thin' as const), (columns, distance, rule) => {
        const selected = select(columns, { near: { km: distance, rule } });
        const { x, y, rows, exclusion } = selected;
        for (let i = 0; i < x.length; i++)
          for (let j = 0; j < i; j++) expect(distanceKm(crs, x[i], y[i], x[j], y[j])).toBeGreaterThanOrEqual(distance * (1 - 1e-9) - 1e-7);
        const kept = [...exclusion.keys()].filter((row) => exclusion[row] === EXCLUSION.none);
        expect([...rows].sort((a, b) => a - b)).toEqual(kept);
        const firsts = rowsOf(selected).map(([first]) => first);
        expect(firsts).toEqual([...firsts].sort((a, b) => a - b));
        if (rule === 'combine') expect(kept.length).toBe(exclusion.length);
        else
          for (const row of exclusion.keys())
            if (exclusion[row] === EXCLUSION.thinned) {
              const nearest = Math.min(...kept.map((k) => distanceKm(crs, columns.x[row], columns.y[row], columns.x[k], columns.y[k])));
              expect(nearest).toBeLessThanOrEqual(distance + 1e-7);
            }
      }),
      { numRuns: 300 },
    );
  });

  it('have the standard deviation and mean of their rows by the textbook formula', () => {
    fc.assert(
      fc.property(cloud('plane-km'), (columns) => {
        const selected = select(columns, { near: { km: 1.5, rule: 'combine' } });
        for (const [i, rows] of rowsOf(selected).entries()) {
          const sd = rows.map((row) => columns.errorSd?.[row] ?? NaN);
          const weights = sd.some(Number.isNaN) ? rows.map(() => 1) : sd.map((s) => 1 / s ** 2);
          const sum = weights.reduce((a, b) => a + b, 0);
          const meanX = rows.reduce((total, row, k) => total + weights[k] * columns.x[row], 0) / sum;
          expect(selected.x[i]).toBeCloseTo(meanX, 9);
          if (sd.some(Number.isNaN)) expect(selected.errorSd?.[i]).toBeNaN();
          else expect(selected.errorSd?.[i]).toBeCloseTo(1 / Math.sqrt(sum), 12);
        }
      }),
    );
  });

  it('do not change when the platform has other transcendental functions', () => {
    const rows: Row[] = Array.from({ length: 200 }, (_, k) => [((k * 7.77) % 3) - 1.5, (k * 1.37) % 2, 1 + (k % 5)]);
    const run = () => select(setOf('lonlat-deg', rows), { near: { km: 30, rule: 'combine' } });
    const before = run();
    const saved = { sin: Math.sin, cos: Math.cos, tan: Math.tan, atan2: Math.atan2, asin: Math.asin, acos: Math.acos, exp: Math.exp, log: Math.log, pow: Math.pow, hypot: Math.hypot };
    const broken = Object.fromEntries(Object.keys(saved).map((name) => [name, () => { throw new Error(`Math.${name}`); }]));
    try {
      Object.assign(Math, broken);
      expect(run()).toEqual(before);
    } finally {
      Object.assign(Math, saved);
    }
  });
});
