import type { Draft } from './design-api.ts';

const LABELS: Record<string, string> = {
  'recipe.bufferKm': 'buffer (km)', 'recipe.corners': 'corners', 'recipe.coreSpacingKm': 'core spacing (km)', 'recipe.growth': 'growth', 'recipe.outline.kind': 'outline',
  'recipe.selection.flags': 'flags kept', 'recipe.selection.near.km': 'near distance (km)', 'recipe.selection.near.rule': 'near rule', 'recipe.selection.keepInside': 'keep inside',
  'recipe.selection.leaveOut': 'leave out', 'recipe.selection.timeWindow.from': 'time from', 'recipe.selection.timeWindow.to': 'time to', 'recipe.selection.level.min': 'level from',
  'recipe.selection.level.max': 'level to', correlation: 'correlation model',
};

/** Leaves of a draft by path; lists count as one leaf. */
const leaves = (value: unknown, path: string, found: Map<string, string>): Map<string, string> => {
  if (value === undefined) return found;
  if (value === null) return found.set(path, 'the study’s');
  if (typeof value === 'object' && !Array.isArray(value)) {
    for (const [key, part] of Object.entries(value)) leaves(part, path === '' ? key : `${path}.${key}`, found);
    return found;
  }
  return found.set(path, Array.isArray(value) && Array.isArray(value[0]) ? `${value.length} corners: ${JSON.stringify(value).slice(0, 60)}` : Array.isArray(value) ? value.join(', ') : String(value));
};

/** What differs between two drafts, in words; "–" where one has no such setting. */
export const draftRows = (mine: Draft, theirs: Draft): { label: string; mine: string; theirs: string }[] => {
  const own = leaves({ recipe: mine.recipe, correlation: mine.correlation }, '', new Map());
  const other = leaves({ recipe: theirs.recipe, correlation: theirs.correlation }, '', new Map());
  return [...new Set([...own.keys(), ...other.keys()])]
    .filter((path) => own.get(path) !== other.get(path))
    .map((path) => ({ label: LABELS[path] ?? path.replace(/^recipe\.|^correlation\./, ''), mine: own.get(path) ?? '–', theirs: other.get(path) ?? '–' }));
};
