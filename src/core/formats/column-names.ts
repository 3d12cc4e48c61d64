import type { AttributeField, ColumnChoice, Mapping } from './mapping.ts';

interface ColumnName {
  /** Words of the header in lower case, without a unit in brackets. */
  words: string[];
  whole: string;
  unit: string;
}

const readName = (header: string): ColumnName => {
  const unit = /[([{]\s*([^)\]}]*?)\s*[)\]}]\s*$/.exec(header.slice(0, 200))?.[1] ?? '';
  const plain = header
    .slice(0, 200)
    .replace(/[([{][^)\]}]*[)\]}]/g, ' ')
    .replace(/([a-z])([A-Z])/g, '$1 $2')
    .toLowerCase();
  const words = plain.split(/[^a-z0-9]+/).filter((word) => word !== '');
  return { words, whole: words.join(' '), unit: unit.toLowerCase() };
};

const set = (text: string): Set<string> => new Set(text.split(' '));

/** Header words that tell a field: as one word among others, or as the whole header. */
const SIGNS: Record<'lon' | 'lat' | 'planeX' | 'planeY' | AttributeField, { word: Set<string>; whole: Set<string> }> = {
  lon: { word: set('lon long longitude lng'), whole: set('') },
  lat: { word: set('lat latitude'), whole: set('') },
  planeX: { word: set('x east easting eastings'), whole: set('xm xkm') },
  planeY: { word: set('y north northing northings'), whole: set('ym ykm') },
  errorSd: { word: set('sd std stdev stddev sigma error err uncertainty'), whole: set('') },
  flag: { word: set('flag qc quality qf'), whole: set('') },
  time: { word: set('time date datetime timestamp epoch'), whole: set('') },
  station: { word: set('station site platform stn'), whole: set('id name code ident identifier iata buoy') },
  level: { word: set('level lev depth height altitude elevation pressure'), whole: set('z alt') },
  value: { word: set('value'), whole: set('val obs observation sst temperature temp salinity speed u uo') },
  value2: { word: set(''), whole: set('v vo value2') },
};

/** Words that only say what a coordinate column refers to. */
const UNITS = set('km m deg degrees');

const matches = (name: ColumnName, field: keyof typeof SIGNS): boolean => {
  const { word, whole } = SIGNS[field];
  return whole.has(name.whole) || name.words.some((w) => word.has(w));
};

/** A plane coordinate's header has no words but its own and a unit, so that "x wind" is none. */
const isPlane = (name: ColumnName, field: 'planeX' | 'planeY'): boolean =>
  matches(name, field) && name.words.every((w) => SIGNS[field].word.has(w) || SIGNS[field].whole.has(w) || UNITS.has(w) || w === 'coordinate' || w === 'coord');

const unitOf = (name: ColumnName): 'km' | 'm' =>
  ['m', 'metre', 'metres', 'meter', 'meters'].includes(name.unit) || name.words.at(-1) === 'm' || name.whole.endsWith('xm')
    ? 'm'
    : 'km';

/**
 * What the headers say about the fields: each column is used at most once, the first that fits wins. `choose` turns
 * a column's number into the choice to note. x and y are absent where no pair of headers tells them.
 */
export const mapColumnNames = (headers: string[], choose: (index: number) => ColumnChoice): Mapping => {
  const names = headers.map(readName);
  const used = new Set<number>();
  const find = (test: (name: ColumnName) => boolean): number => names.findIndex((name, i) => !used.has(i) && test(name));
  const mapping: Mapping = { coordinates: 'lonlat', planeUnit: 'km' };

  const pair = (x: number, y: number): boolean => {
    if (x < 0 || y < 0 || x === y) return false;
    mapping.x = choose(x);
    mapping.y = choose(y);
    used.add(x).add(y);
    return true;
  };
  const isGeographic = pair(
    find((name) => matches(name, 'lon')),
    find((name) => matches(name, 'lat')),
  );
  if (!isGeographic) {
    const x = find((name) => isPlane(name, 'planeX'));
    const isPlaneSet = pair(
      x,
      find((name) => isPlane(name, 'planeY')),
    );
    if (isPlaneSet) {
      mapping.coordinates = 'plane';
      mapping.planeUnit = unitOf(names[x]);
    }
  }
  for (const field of ['errorSd', 'flag', 'time', 'station', 'level', 'value2', 'value'] as const) {
    const index = find((name) => matches(name, field));
    if (index < 0) continue;
    mapping[field] = choose(index);
    used.add(index);
  }
  // a second component without a first is not one
  if (mapping.value === undefined) delete mapping.value2;
  return mapping;
};
