/** Distance from a place to the nearest of segments x1 y1 x2 y2. */
export const distanceToSegments = (x: number, y: number, segments: Float32Array): number => {
  let least = Infinity;
  for (let k = 0; k < segments.length; k += 4) {
    const ax = segments[k], ay = segments[k + 1], ux = segments[k + 2] - ax, uy = segments[k + 3] - ay;
    const length = ux * ux + uy * uy;
    const t = length > 0 ? Math.min(1, Math.max(0, ((x - ax) * ux + (y - ay) * uy) / length)) : 0;
    least = Math.min(least, Math.hypot(x - ax - t * ux, y - ay - t * uy));
  }
  return least;
};

/** Whether a place lies inside the loops that segments form. */
export const isInsideSegments = (x: number, y: number, segments: Float32Array): boolean => {
  let isInside = false;
  for (let k = 0; k < segments.length; k += 4) {
    const ax = segments[k], ay = segments[k + 1], bx = segments[k + 2], by = segments[k + 3];
    if (ay > y !== by > y && x < ax + ((y - ay) * (bx - ax)) / (by - ay)) isInside = !isInside;
  }
  return isInside;
};

/** Distance outside the outline in map kilometres: negative inside it. */
export const distanceOutside = (x: number, y: number, outline: Float32Array): number => {
  const distance = distanceToSegments(x, y, outline);
  return isInsideSegments(x, y, outline) ? -distance : distance;
};
