import type { TaskRegistry } from './task.ts';
import { checkDesignTask } from './tasks/check-design.ts';
import { readObservationsTask } from './tasks/read-observations.ts';
import { rebuildVersionTask } from './tasks/rebuild-version.ts';
import { saveVersionTask } from './tasks/save-version.ts';

/** Every kind of job and the task that does it. */
export const registry: TaskRegistry = {
  'read-observations': readObservationsTask,
  'check-design': checkDesignTask,
  'save-version': saveVersionTask,
  'rebuild-version': rebuildVersionTask,
};
