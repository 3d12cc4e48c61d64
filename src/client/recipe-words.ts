import type { Recipe } from '#core/design/recipe.ts';

import { formatKm, formatTime, plural } from './format.ts';

const NEAR_WORDS: Record<Recipe['selection']['near']['rule'], string> = {
  combine: 'combined by their inverse-variance mean',
  thin: 'thinned: the one with the smallest error stays',
  refuse: 'refused',
};

/** A recipe as label and sentence, one for each decision. */
export const recipeWords = (recipe: Recipe): [string, string][] => {
  const { selection: s } = recipe;
  const words: [string, string][] = [];
  if (s.flags) words.push(['Quality flags', s.flags.length === 0 ? 'none kept' : s.flags.map((flag) => flag || 'rows without a flag').join(', ')]);
  if (s.timeWindow) words.push(['Time window (UTC)', `${formatTime(1000 * s.timeWindow.from)} to ${formatTime(1000 * s.timeWindow.to)}`]);
  if (s.level) words.push(['Level', `${s.level.min} to ${s.level.max}`]);
  if (s.keepInside) words.push(['Kept', `inside a polygon of ${plural(s.keepInside.length, 'corner')}`]);
  if (s.leaveOut) words.push(['Left out', `inside a polygon of ${plural(s.leaveOut.length, 'corner')}`]);
  words.push(['Near observations', `${s.near.km === 0 ? 'in one place' : `closer than ${formatKm(s.near.km)}`}: ${NEAR_WORDS[s.near.rule]}`]);
  words.push(['Outline', recipe.outline.kind === 'convex' ? 'convex hull of the observations' : 'smallest box around the observations']);
  words.push(['Buffer', `${formatKm(recipe.bufferKm)}, ${recipe.corners === 'round' ? 'rounded' : 'squared-off'} corners`]);
  words.push(['Core spacing', recipe.coreSpacingKm === undefined ? 'derived from the observations' : formatKm(recipe.coreSpacingKm)]);
  words.push(['Growth', `${recipe.growth} per element`]);
  return words;
};
