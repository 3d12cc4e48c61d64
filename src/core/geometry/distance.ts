/** Distance between two plane positions. The square root of products has the same bits everywhere; `**` need not. */
export const planeDistance = (ax: number, ay: number, bx: number, by: number): number => {
  const dx = bx - ax;
  const dy = by - ay;
  return Math.sqrt(dx * dx + dy * dy);
};

/** Length of the vector of 3 components at an offset. */
export const vectorLength = (v: ArrayLike<number>, at = 0): number => Math.sqrt(v[at] * v[at] + v[at + 1] * v[at + 1] + v[at + 2] * v[at + 2]);
