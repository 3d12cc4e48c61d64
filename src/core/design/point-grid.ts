/** Points looked up by distance: a hash grid whose cells are two reaches wide, so that a look-up meets few of them. */
export interface PointGrid {
  insert(i: number): void;
  /** Takes an inserted point out, at the position that it was inserted with. */
  remove(i: number): void;
  /** Whether an inserted point lies closer to point i than the reach (or, with reach 0, coincides with it). */
  hasNear(i: number): boolean;
  /** The nearest inserted point that `hasNear` means, of equally near ones the lowest index; -1 without one. */
  nearest(i: number): number;
  /** Every inserted point that `hasNear` means, point i itself left out, in no particular order. */
  listNear(i: number): number[];
}

/**
 * An empty grid over points of 3 coordinates each, for about `capacity` of them; `isFlat` where z is 0 throughout. Uses
 * exactly rounded arithmetic only, so every machine finds the same neighbours. Where inserted points keep one reach
 * apart, a look-up costs a bounded number of comparisons.
 */
export const createPointGrid = (points: Float64Array, reach: number, capacity: number, isFlat: boolean): PointGrid => {
  const mask = 2 ** Math.max(4, 33 - Math.clz32(capacity)) - 1;
  const head = new Int32Array(mask + 1).fill(-1);
  const next = new Int32Array(points.length / 3);
  const reach2 = reach * reach;
  const width = 2 * reach;
  const words = new Uint32Array(6);
  const floats = new Float64Array(words.buffer);

  const bucket = (a: number, b: number, c: number): number => {
    let hash = Math.imul(a, 0x9e3779b1) ^ Math.imul(b, 0x85ebca6b) ^ Math.imul(c, 0xc2b2ae35);
    hash = Math.imul(hash ^ (hash >>> 15), 0x2c1b3c6d);
    return (hash ^ (hash >>> 13)) & mask;
  };
  const home = (i: number): number => {
    if (reach > 0)
      return bucket(Math.floor(points[3 * i] / width), Math.floor(points[3 * i + 1] / width), Math.floor(points[3 * i + 2] / width));
    for (let k = 0; k < 3; k++) floats[k] = points[3 * i + k];
    return bucket(words[0] ^ Math.imul(words[1], 31), words[2] ^ Math.imul(words[3], 31), words[4] ^ Math.imul(words[5], 31));
  };
  // squares of tiny differences underflow to 0: coincidence compares the coordinates themselves
  const coincides = (i: number, j: number): boolean =>
    points[3 * i] === points[3 * j] && points[3 * i + 1] === points[3 * j + 1] && points[3 * i + 2] === points[3 * j + 2];

  /** Squared distance of an inserted point near to i, or Infinity. */
  const nearness = (i: number, j: number): number => {
    if (reach === 0) return coincides(i, j) ? 0 : Infinity;
    const dx = points[3 * i] - points[3 * j];
    const dy = points[3 * i + 1] - points[3 * j + 1];
    const dz = points[3 * i + 2] - points[3 * j + 2];
    const distance2 = dx * dx + dy * dy + dz * dz;
    return distance2 < reach2 ? distance2 : Infinity;
  };

  // the buckets of the cells within reach, each once: two cells a side, one more each way where rounding has its say
  const buckets = new Int32Array(64);
  const findBuckets = (i: number): number => {
    buckets[0] = home(i);
    if (reach === 0) return 1;
    let count = 1;
    const west = Math.floor((points[3 * i] - reach) / width);
    const south = Math.floor((points[3 * i + 1] - reach) / width);
    const bottom = Math.floor((points[3 * i + 2] - reach) / width);
    const columns = Math.min(3, Math.floor((points[3 * i] + reach) / width) - west);
    const rows = Math.min(3, Math.floor((points[3 * i + 1] + reach) / width) - south);
    const layers = isFlat ? 0 : Math.min(3, Math.floor((points[3 * i + 2] + reach) / width) - bottom);
    for (let c = 0; c <= layers; c++)
      for (let b = 0; b <= rows; b++)
        for (let a = 0; a <= columns; a++) {
          const at = bucket(west + a, south + b, isFlat ? 0 : bottom + c);
          if (head[at] < 0) continue;
          let isKnown = false;
          for (let k = 0; k < count; k++) if (buckets[k] === at) isKnown = true;
          if (!isKnown) buckets[count++] = at;
        }
    return count;
  };

  return {
    insert(i) {
      const at = home(i);
      next[i] = head[at];
      head[at] = i;
    },
    remove(i) {
      const at = home(i);
      if (head[at] === i) {
        head[at] = next[i];
        return;
      }
      let before = head[at];
      while (next[before] !== i) before = next[before];
      next[before] = next[i];
    },
    hasNear(i) {
      const own = head[home(i)];
      for (let j = own; j >= 0; j = next[j]) if (nearness(i, j) < Infinity) return true;
      const count = findBuckets(i);
      for (let k = 1; k < count; k++)
        for (let j = head[buckets[k]]; j >= 0; j = next[j]) if (nearness(i, j) < Infinity) return true;
      return false;
    },
    nearest(i) {
      let best = -1;
      let least = Infinity;
      const count = findBuckets(i);
      for (let k = 0; k < count; k++)
        for (let j = head[buckets[k]]; j >= 0; j = next[j]) {
          const distance2 = nearness(i, j);
          if (distance2 > least || distance2 === Infinity || (distance2 === least && j > best)) continue;
          best = j;
          least = distance2;
        }
      return best;
    },
    listNear(i) {
      const near: number[] = [];
      const count = findBuckets(i);
      for (let k = 0; k < count; k++)
        for (let j = head[buckets[k]]; j >= 0; j = next[j]) if (j !== i && nearness(i, j) < Infinity) near.push(j);
      return near;
    },
  };
};
