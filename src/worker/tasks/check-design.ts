import type { Recipe } from '#core/design/recipe.ts';
import { ObservationSetRow } from '#db/models/ObservationSetRow.ts';
import type { Correlation } from '#schemas/correlation.ts';
import { AppError } from '#server/errors.ts';

import type { CheckAnswer } from '../numerics/check-recipe.ts';
import type { Task, TaskContext } from '../task.ts';
import { runInThread } from '../threads.ts';

/** Mesh and findings of a recipe on a stored observation set, computed in a thread. @throws AppError NOT_FOUND, NumericalError */
export const computeCheck = async (observationSetId: string, recipe: Recipe, model: Correlation, { signal, reportProgress }: TaskContext): Promise<CheckAnswer> => {
  const set = await ObservationSetRow.findByPk(observationSetId);
  if (!set) throw new AppError('NOT_FOUND', 'The observation set is gone. Choose another one for this design.');
  return runInThread<CheckAnswer>({ kind: 'check-recipe', columnsBundle: new Uint8Array(set.columnsBundle), recipe, model }, { signal, onProgress: reportProgress });
};

/** Checks a design's recipe: `checkResultSchema` is the result. */
export const checkDesignTask: Task = async (payload, context) => {
  const { observationSetId, recipe, correlation, revision } = payload as unknown as { observationSetId: string; recipe: Recipe; correlation: Correlation; revision: number };
  const { meshHash, findings, figures, timings } = await computeCheck(observationSetId, recipe, correlation, context);
  return { meshHash, findings, figures, timings, revision };
};
