import { describe, expect, it } from 'vitest';

import { cornerExcess } from '#core/correlation/boundary-effect.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import { defaultRecipe } from '#core/design/default-recipe.ts';
import type { ObservationColumns } from '#core/design/observations.ts';
import { recipeSchema } from '#schemas/recipe.ts';

const lattice = (count: number, h: number): ObservationColumns => ({
  crs: 'plane-km',
  x: Float64Array.from({ length: count * count }, (_, k) => h * (k % count)),
  y: Float64Array.from({ length: count * count }, (_, k) => h * Math.floor(k / count)),
  line: Uint32Array.from({ length: count * count }, (_, k) => k + 2),
});

const model = (more: Partial<CorrelationModel> = {}): CorrelationModel => ({
  kind: 'scalar',
  daleyKm: 100,
  steps: 4,
  mass: 'consistent',
  normalisation: 'theory',
  tolerance: 0.01,
  sphereRadiusKm: 6371,
  ...more,
});

describe('defaultRecipe', () => {
  it('is a recipe that the schema accepts, whatever the model', () => {
    for (const kind of ['scalar', 'vector'] as const)
      for (const normalisation of ['exact', 'theory'] as const)
        for (const scale of [{ daleyKm: 3 }, { daleyKm: 3000 }, { daleyKm: undefined, scaleKm: 50 }])
          expect(recipeSchema.safeParse(defaultRecipe(lattice(12, 10), model({ kind, normalisation, steps: 6, ...scale }))).success).toBe(true);
  });

  it('has a buffer that keeps a sharp corner within half the tolerance, and not much more', () => {
    const m = model();
    const { bufferKm } = defaultRecipe(lattice(20, 10), m);
    const turning = (2 * Math.PI) / 3;
    expect(cornerExcess(m, bufferKm, turning).variance).toBeLessThanOrEqual(0.005);
    expect(cornerExcess(m, 0.9 * bufferKm, turning).variance).toBeGreaterThan(0.005);
  });

  it('leaves the core spacing to observations that are dense enough, and fills where they are not', () => {
    expect(defaultRecipe(lattice(20, 10), model()).coreSpacingKm).toBeUndefined();
    expect(defaultRecipe(lattice(20, 40), model()).coreSpacingKm).toBe(20);
    // two components need finer meshes (h/D of 0.1 or less)
    expect(defaultRecipe(lattice(20, 40), model({ kind: 'vector', rotationalShare: 0.5 })).coreSpacingKm).toBe(9);
  });

  it('does not fill a wide hull at any cost', () => {
    expect(defaultRecipe(lattice(20, 1000), model({ daleyKm: 10 })).coreSpacingKm).toBeUndefined();
  });

  it('combines what a hundredth of the spacing separates', () => {
    expect(defaultRecipe(lattice(20, 10), model()).selection).toEqual({ near: { km: 0.1, rule: 'combine' } });
  });

  it('starts a set in one place as well', () => {
    const recipe = defaultRecipe(lattice(1, 1), model());
    expect(recipe.selection.near.km).toBe(0);
    expect(recipe.coreSpacingKm).toBeUndefined();
  });
});
