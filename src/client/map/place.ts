/** What "show me" flies to; indices are of the mesh on the map. */
export interface Place {
  elements?: number[];
  nodes?: number[];
  /** Indices of the selected observations. */
  observations?: number[];
}

const KINDS = ['elements', 'nodes', 'observations'] as const;
const MOST = 200;

/** The place in a URL's hash, such as `#show=elements:1,2;nodes:7`; null without one. */
export const readPlace = (hash: string): Place | null => {
  const text = new URLSearchParams(hash.replace(/^#/, '')).get('show');
  if (text === null) return null;
  const place: Place = {};
  for (const part of text.split(';')) {
    const [kind, list = ''] = part.split(':');
    const known = KINDS.find((one) => one === kind);
    if (!known) continue;
    const indices = list.split(',').filter((one) => /^\d+$/.test(one)).map(Number).slice(0, MOST);
    if (indices.length > 0) place[known] = indices;
  }
  return KINDS.some((kind) => place[kind]) ? place : null;
};

/** The hash that `readPlace` reads, without the leading number sign. */
export const writePlace = (place: Place): string =>
  `show=${KINDS.filter((kind) => place[kind]?.length).map((kind) => `${kind}:${place[kind]!.slice(0, MOST).join(',')}`).join(';')}`;

/** "3 elements", "observation 214": the place in words. */
export const placeWords = (place: Place): string =>
  KINDS.filter((kind) => place[kind]?.length)
    .map((kind) => (place[kind]!.length === 1 ? `${kind.slice(0, -1)} ${place[kind]![0]}` : `${place[kind]!.length} ${kind}`))
    .join(', ');

export const SHOW_EVENT = 'selvage:show';

/** Asks the maps on the page to fly to a place. */
export const showPlace = (place: Place): void => {
  window.dispatchEvent(new CustomEvent<Place>(SHOW_EVENT, { detail: place }));
};
