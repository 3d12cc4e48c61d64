/** Points of `dimensions` coordinates each, looked up by distance: a hash grid whose cells are one reach wide. */
export interface PointGrid {
  insert(i: number): void;
  /** Whether an inserted point lies closer to point i than the reach (or, with reach 0, coincides with it). */
  hasNear(i: number): boolean;
  /** The nearest inserted point that `hasNear` means, of equally near ones the lowest index; -1 without one. */
  nearest(i: number): number;
}

/**
 * An empty grid over `points`. Uses only exactly rounded arithmetic, so every machine finds the same neighbours.
 * Where inserted points keep one reach apart, a look-up costs a bounded number of comparisons.
 */
export const createPointGrid = (points: Float64Array, dimensions: 2 | 3, reach: number): PointGrid => {
  const count = points.length / dimensions;
  const bits = Math.max(4, Math.ceil(Math.log2(count + 1)) + 1);
  const mask = 2 ** bits - 1;
  const head = new Int32Array(mask + 1).fill(-1);
  const next = new Int32Array(count);
  const reach2 = reach * reach;
  const words = new Uint32Array(6);
  const floats = new Float64Array(words.buffer);
  const around = reach > 0 ? 1 : 0;

  const bucket = (a: number, b: number, c: number): number => {
    let hash = Math.imul(a, 0x9e3779b1) ^ Math.imul(b, 0x85ebca6b) ^ Math.imul(c, 0xc2b2ae35);
    hash = Math.imul(hash ^ (hash >>> 15), 0x2c1b3c6d);
    return (hash ^ (hash >>> 13)) & mask;
  };
  const coincidenceBucket = (i: number): number => {
    for (let k = 0; k < dimensions; k++) floats[k] = points[i * dimensions + k];
    return bucket(words[0] ^ Math.imul(words[1], 31), words[2] ^ Math.imul(words[3], 31), words[4] ^ words[5]);
  };
  const cell = (i: number, k: number): number => Math.floor(points[i * dimensions + k] / reach);

  const distance2 = (i: number, j: number): number => {
    let sum = 0;
    for (let k = 0; k < dimensions; k++) {
      const d = points[i * dimensions + k] - points[j * dimensions + k];
      sum += d * d;
    }
    return sum;
  };
  // squares of tiny differences underflow to 0: coincidence compares the coordinates themselves
  const coincides = (i: number, j: number): boolean => {
    for (let k = 0; k < dimensions; k++) if (points[i * dimensions + k] !== points[j * dimensions + k]) return false;
    return true;
  };

  const search = (i: number, stopAtFirst: boolean): number => {
    let best = -1;
    let bestDistance2 = Infinity;
    const visit = (start: number): void => {
      for (let j = head[start]; j >= 0; j = next[j]) {
        const d = distance2(i, j);
        if (reach > 0 ? d >= reach2 : !coincides(i, j)) continue;
        if (d > bestDistance2 || (d === bestDistance2 && j > best)) continue;
        best = j;
        bestDistance2 = d;
        if (stopAtFirst) return;
      }
    };
    if (reach === 0) {
      visit(coincidenceBucket(i));
      return best;
    }
    const a = cell(i, 0);
    const b = cell(i, 1);
    const c = dimensions === 3 ? cell(i, 2) : 0;
    const deep = dimensions === 3 ? 1 : 0;
    for (let dc = -deep; dc <= deep; dc++)
      for (let db = -around; db <= around; db++)
        for (let da = -around; da <= around; da++) {
          visit(bucket(a + da, b + db, c + dc));
          if (stopAtFirst && best >= 0) return best;
        }
    return best;
  };

  return {
    insert(i) {
      const at =
        reach === 0 ? coincidenceBucket(i) : bucket(cell(i, 0), cell(i, 1), dimensions === 3 ? cell(i, 2) : 0);
      next[i] = head[at];
      head[at] = i;
    },
    hasNear: (i) => search(i, true) >= 0,
    nearest: (i) => search(i, false),
  };
};
