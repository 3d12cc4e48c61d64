/** A number that grows with the angle of (x, y) in (-pi, pi], without trigonometry: -2 to 2. */
const turnOf = (x: number, y: number): number => {
  const sum = Math.abs(x) + Math.abs(y);
  const share = sum > 0 ? y / sum : 0;
  if (x >= 0) return share;
  return y >= 0 ? 2 - share : -2 - share;
};

/**
 * For a ring (2 per corner) that runs counter-clockwise round (cx, cy): finds the side that the ray from there
 * through a position crosses, by bisection. Side i runs from corner i to the next.
 */
export const createSectorIndex = (ring: Float64Array, cx: number, cy: number): ((x: number, y: number) => number) => {
  const count = ring.length / 2;
  const turns = Float64Array.from({ length: count }, (_, i) => turnOf(ring[2 * i] - cx, ring[2 * i + 1] - cy));
  let first = 0;
  for (let i = 1; i < count; i++) if (turns[i] < turns[first]) first = i;
  return (x, y) => {
    const turn = turnOf(x - cx, y - cy);
    // the last corner, counted from the first, that lies before the position
    let low = -1;
    let high = count;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (turns[(first + middle) % count] <= turn) low = middle;
      else high = middle;
    }
    return (first + low + count) % count;
  };
};
