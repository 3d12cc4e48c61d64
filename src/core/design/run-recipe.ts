import type { BuildOptions, PreparedObservations } from './build-mesh.ts';
import { meshPrepared, prepareMesh } from './build-mesh.ts';
import type { DesignedMesh, SelectedObservations } from './designed-mesh.ts';
import type { ObservationColumns } from './observations.ts';
import type { Recipe } from './recipe.ts';
import { selectObservations } from './select-observations.ts';

export interface RecipeResult {
  selected: SelectedObservations;
  mesh: DesignedMesh;
}

/**
 * Observations and recipe to mesh: the one function that the browser, the worker, the command line and a rebuild call.
 * @throws NumericalError of `selectObservations` and `buildMesh`.
 */
export const runRecipe = (columns: ObservationColumns, recipe: Recipe, options: BuildOptions): RecipeResult =>
  createRecipeRunner(columns)(recipe, options);

/**
 * `runRecipe` for one observation set, again and again: selection, outline and local spacing are kept from the last
 * run while the recipe asks for the same ones, so that moving the buffer pays only for the mesh. Same bytes as `runRecipe`.
 */
export const createRecipeRunner = (columns: ObservationColumns): ((recipe: Recipe, options: BuildOptions) => RecipeResult) => {
  let key = '';
  let prepared: PreparedObservations | null = null;
  return (recipe, options) => {
    const wanted = JSON.stringify([recipe.selection, recipe.outline, options.sphereRadiusKm]);
    if (!prepared || wanted !== key) {
      options.onPhase?.('selection', 0);
      prepared = null;
      const selected = selectObservations(columns, recipe.selection, { sphereRadiusKm: options.sphereRadiusKm });
      prepared = prepareMesh(selected, recipe, options.sphereRadiusKm);
      key = wanted;
    }
    return { selected: prepared.selected, mesh: meshPrepared(prepared, recipe, options) };
  };
};
