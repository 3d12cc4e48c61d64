const formats = new Map<string, Intl.NumberFormat>();

const numberFormat = (options: Intl.NumberFormatOptions): Intl.NumberFormat => {
  const key = JSON.stringify(options);
  let format = formats.get(key);
  if (!format) formats.set(key, (format = new Intl.NumberFormat('en', options)));
  return format;
};

/** A count with thousands separators. */
export const formatCount = (value: number): string => numberFormat({ maximumFractionDigits: 0 }).format(value);

/** A figure with the given significant digits; very small and very large ones in scientific notation. */
export const formatFigure = (value: number, digits = 3): string => {
  if (value === 0) return '0';
  const size = Math.abs(value);
  if (size < 1e-4 || size >= 1e9) return value.toExponential(Math.max(0, digits - 1)).replace(/\.?0*e\+?/, 'e');
  return numberFormat({ maximumSignificantDigits: Math.max(digits, size >= 1 ? Math.ceil(Math.log10(size + 1)) : digits) }).format(value);
};

/** A distance in km. */
export const formatKm = (km: number, digits = 3): string => `${formatFigure(km, digits)} km`;

/** A share as a percentage: 0.01 is 1 %. */
export const formatPercent = (share: number, digits = 2): string => `${formatFigure(100 * share, digits)} %`;

/** Bytes in the unit that suits them. */
export const formatBytes = (bytes: number): string => {
  if (bytes < 1000) return `${bytes} B`;
  return bytes < 1e6 ? `${formatFigure(bytes / 1000)} kB` : `${formatFigure(bytes / 1e6)} MB`;
};

/** Day and minute in UTC: 2026-03-01 12:00. */
export const formatTime = (time: string | number | Date): string => new Date(time).toISOString().slice(0, 16).replace('T', ' ');

/** Longitude or latitude with its side. */
export const formatDegrees = (degrees: number, axis: 'lon' | 'lat'): string => {
  const side = degrees === 0 ? '' : axis === 'lon' ? (degrees < 0 ? ' W' : ' E') : degrees < 0 ? ' S' : ' N';
  return `${Math.abs(degrees).toFixed(3)}°${side}`;
};

/** "1 row", "3 rows". */
export const plural = (count: number, one: string, many = `${one}s`): string => `${formatCount(count)} ${count === 1 ? one : many}`;

/** Milliseconds as seconds or minutes. */
export const formatElapsed = (ms: number): string => (ms < 60_000 ? `${(ms / 1000).toFixed(ms < 10_000 ? 1 : 0)} s` : `${Math.floor(ms / 60_000)} min ${Math.floor((ms % 60_000) / 1000)} s`);
