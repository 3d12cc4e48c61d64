import type { Ring } from '#core/design/recipe.ts';

/** Corners as text, one "x, y" per line. */
export const writeRing = (ring: Ring | undefined): string => (ring ?? []).map(([x, y]) => `${x}, ${y}`).join('\n');

/** Reads corners, one per line, x and y apart by comma, semicolon, tab or spaces; an empty text is no polygon. */
export const readRing = (text: string, crs: 'lonlat-deg' | 'plane-km'): { ring?: Ring } | { problem: string } => {
  const ring: Ring = [];
  const lines = text.split('\n');
  for (let k = 0; k < lines.length; k++) {
    const line = lines[k].trim();
    if (line === '') continue;
    const parts = line.split(/[\s,;]+/).filter((part) => part !== '');
    const [x, y] = parts.map(Number);
    if (parts.length !== 2 || !Number.isFinite(x) || !Number.isFinite(y))
      return { problem: `Line ${k + 1} is "${line.slice(0, 40)}". Write one corner per line as two numbers, such as ${crs === 'plane-km' ? '120, 45.5' : '3.5, 54.25 (longitude, latitude)'}.` };
    if (crs === 'lonlat-deg' && Math.abs(y) > 90) return { problem: `Line ${k + 1} has latitude ${y}. Longitude comes first, then a latitude from -90 to 90.` };
    if (crs === 'lonlat-deg' && Math.abs(x) > 360) return { problem: `Line ${k + 1} has longitude ${x}. Give a longitude from -180 to 360.` };
    ring.push([x, y]);
  }
  const first = ring[0];
  const last = ring[ring.length - 1];
  if (ring.length > 3 && first[0] === last[0] && first[1] === last[1]) ring.pop();
  if (ring.length === 0) return {};
  if (ring.length < 3) return { problem: `A polygon needs at least three corners; there ${ring.length === 1 ? 'is one' : 'are two'}.` };
  return { ring };
};
