const significant = (value: number, digits: number): string =>
  value.toLocaleString('en-GB', { maximumSignificantDigits: digits });

/** "310 km", "1,250 km", "0.85 km": three significant digits, all digits from 1,000 up. */
export const formatKm = (km: number): string => `${km >= 1000 ? Math.round(km).toLocaleString('en-GB') : significant(km, 3)} km`;

/** A relative change as "0.7 %", "0.034 %", "12 %": two significant digits; below 0.0001 % "under 0.0001 %". */
export const formatPercent = (share: number): string => {
  const percent = 100 * share;
  if (percent !== 0 && Math.abs(percent) < 1e-4) return 'under 0.0001 %';
  return `${significant(percent, 2)} %`;
};

/** `formatPercent`, with as many digits as it takes to tell the value from the limit. */
export const formatAgainst = (share: number, limit: number): string => {
  for (let digits = 2; digits < 6; digits++) {
    const text = `${significant(100 * share, digits)} %`;
    if (text !== `${significant(100 * limit, digits)} %`) return formatPercent(share).startsWith('under') ? formatPercent(share) : text;
  }
  return formatPercent(share);
};

export const formatCount = (count: number): string => Math.round(count).toLocaleString('en-GB');

/** "4.2 million", for products too long to read. */
export const formatLarge = (count: number): string =>
  count >= 1e6 ? `${significant(count / 1e6, 3)} million` : formatCount(count);

export const formatNumber = (value: number, digits = 3): string => significant(value, digits);

/** "54.2° N 3.05° E", or "x 12.5 km, y -3 km" in the plane. */
export const formatPosition = (x: number, y: number, crs: 'lonlat-deg' | 'plane-km'): string => {
  if (crs === 'plane-km') return `x ${significant(x, 6)} km, y ${significant(y, 6)} km`;
  const degrees = (v: number): string => Math.abs(v).toLocaleString('en-GB', { maximumFractionDigits: 4 });
  return `${degrees(y)}° ${y < 0 ? 'S' : 'N'} ${degrees(x)}° ${x < 0 ? 'W' : 'E'}`;
};

/** "3 s", "2 min 5 s". */
export const formatElapsed = (seconds: number): string => {
  const whole = Math.max(0, Math.floor(seconds));
  return whole < 60 ? `${whole} s` : `${Math.floor(whole / 60)} min ${whole % 60} s`;
};

export interface MarginFigures {
  bufferKm: number;
  /** Daley length, null with 2 steps: then the diffusion scale is the measure. */
  daleyKm: number | null;
  scaleKm: number;
  /** Largest effect in force over all observations; null before there is a mesh. */
  worst: number | null;
  observation: number;
  tolerance: number;
}

/** The strip's sentence: "Buffer 310 km = 2.1 D. Largest boundary effect 0.7 % (limit 1 %), at observation 214." */
export const marginSentence = (m: MarginFigures): string => {
  const [length, unit] = m.daleyKm === null ? [m.scaleKm, 'l'] : [m.daleyKm, 'D'];
  const buffer = `Buffer ${formatKm(m.bufferKm)} = ${significant(m.bufferKm / length, 2)} ${unit}.`;
  if (m.worst === null) return buffer;
  return `${buffer} Largest boundary effect ${formatAgainst(m.worst, m.tolerance)} (limit ${formatPercent(m.tolerance)}), at observation ${m.observation}.`;
};
