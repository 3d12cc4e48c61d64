import type { Recipe } from '#core/design/recipe.ts';
import type { Correlation } from '#schemas/correlation.ts';
import type { Design } from '#schemas/designs.ts';
import type { CheckResult } from '#schemas/findings.ts';
import { recipeSchema } from '#schemas/recipe.ts';
import type { Job } from '#schemas/jobs.ts';
import type { ObservationSet } from '#schemas/observation-sets.ts';
import type { DisplayFrame } from '#client/map/display-projection.ts';

import type { Autosave, SaveOutcome, SaveState } from './autosave.ts';
import { createAutosave } from './autosave.ts';
import type { DesignResult } from './compute-design.ts';
import type { Draft } from './design-api.ts';
import * as api from './design-api.ts';
import type { DesignEngine, DesignFailure } from './design-engine.ts';
import { createDesignEngine } from './design-engine.ts';
import { problemOf } from './problems.ts';
import type { History } from './history.ts';
import { changeTo, endGesture, redo, startHistory, undo } from './history.ts';
import { watchJob } from './watch-job.ts';

export interface CheckState {
  job: Job | null;
  /** When the job on show was started, by the page's clock. */
  startedAt: number;
  result: CheckResult | null;
  /** The draft that `result` judged. */
  checked: Draft | null;
  problem: string | null;
}

export interface SessionState {
  phase: 'loading' | 'ready' | 'failed';
  loadProblem: string;
  design: Design | null;
  set: ObservationSet | null;
  studyCorrelation: Correlation | null;
  history: History<Draft> | null;
  save: SaveState;
  /** Both versions of a design that two people changed. */
  conflict: { mine: Draft; theirs: Design } | null;
  frame: DisplayFrame | null;
  result: DesignResult | null;
  failure: DesignFailure | null;
  isBuilding: boolean;
  buildPhase: string;
  check: CheckState;
  /** Where a version is being saved. */
  saving: { job: Job | null; problem: string | null; versionId: string | null };
}

export interface DesignSession {
  getState(): SessionState;
  subscribe(listener: () => void): () => void;
  changeRecipe(change: Partial<Recipe>, gesture?: string): void;
  changeCorrelation(correlation: Correlation | null, gesture?: string): void;
  endGesture(): void;
  undo(): void;
  redo(): void;
  showCells(isShown: boolean): void;
  resolveConflict(choice: 'mine' | 'theirs' | 'new', name?: string): Promise<string | null>;
  startCheck(): Promise<void>;
  cancelCheck(): Promise<void>;
  saveVersion(note: string, reason: string): Promise<void>;
  clearSaving(): void;
  destroy(): void;
}

const sameDraft = (a: Draft | null, b: Draft | null): boolean => JSON.stringify(a) === JSON.stringify(b);

/** True when the design changed since its last check. */
export const isCheckOld = (state: SessionState): boolean => state.check.checked !== null && !sameDraft(state.check.checked, state.history?.present ?? null);

/** The model that holds for a draft. */
export const modelOf = (state: SessionState): Correlation | null => state.history?.present.correlation ?? state.studyCorrelation;

const noCheck: CheckState = { job: null, startedAt: 0, result: null, checked: null, problem: null };

/** Holds one design while it is worked on: draft and its history, mesh, saving, check. */
export const createDesignSession = (designId: string): DesignSession => {
  const listeners = new Set<() => void>();
  let state: SessionState = {
    phase: 'loading', loadProblem: '', design: null, set: null, studyCorrelation: null, history: null, save: { kind: 'saved' }, conflict: null,
    frame: null, result: null, failure: null, isBuilding: true, buildPhase: 'observations', check: noCheck, saving: { job: null, problem: null, versionId: null },
  };
  let engine: DesignEngine | null = null;
  let autosave: Autosave<Draft> | null = null;
  let withCells = false;
  let isDestroyed = false;
  let checkWatch: { destroy(): void } | null = null;
  let saveWatch: { destroy(): void } | null = null;

  const set = (change: Partial<SessionState>): void => {
    if (isDestroyed) return;
    state = { ...state, ...change };
    for (const listener of listeners) listener();
  };
  const build = (): void => {
    const model = modelOf(state);
    if (!engine || !state.frame || !state.history || !model) return;
    if (!state.isBuilding) set({ isBuilding: true });
    const { recipe } = state.history.present;
    engine.request({ recipe, model, withCells: withCells && !hasCellsOf(recipe) });
  };

  /** Cells depend on the selection alone: those of the result before are kept while it stays the same. */
  const hasCellsOf = ({ selection }: Recipe): boolean => state.result !== null && state.result.cells !== null && JSON.stringify(selection) === JSON.stringify(state.result.recipe.selection);

  const save = async (draft: Draft): Promise<SaveOutcome> => {
    const design = state.design!;
    if (sameDraft(draft, { recipe: design.recipe, correlation: design.correlation })) return { kind: 'saved' };
    const valid = recipeSchema.safeParse(draft.recipe);
    if (!valid.success) return { kind: 'failed', reason: valid.error.issues[0].message };
    try {
      set({ design: await api.patchDesign(designId, design.revision, draft) });
      return { kind: 'saved' };
    } catch (error) {
      const problem = problemOf(error);
      if (problem.code !== 'DESIGN_CHANGED') return { kind: 'failed', reason: problem.detail };
      try {
        const theirs = (problem.details?.['current'] as Design | undefined) ?? (await api.getDesign(designId));
        set({ conflict: { mine: state.history!.present, theirs } });
      } catch (again) {
        return { kind: 'failed', reason: problemOf(again).detail };
      }
      return { kind: 'conflict' };
    }
  };

  const setHistory = (history: History<Draft>): void => {
    const before = state.history?.present;
    if (history === state.history) return;
    set({ history });
    if (history.present === before) return;
    autosave?.note(history.present);
    if (state.conflict) set({ conflict: { ...state.conflict, mine: history.present } });
    build();
  };

  const load = async (): Promise<void> => {
    try {
      const design = await api.getDesign(designId);
      const [observationSet, study, bytes] = await Promise.all([api.getObservationSet(design.observationSetId), api.getStudy(design.studyId), api.getColumnsBundle(design.observationSetId)]);
      if (isDestroyed) return;
      set({
        phase: 'ready', design, set: observationSet, studyCorrelation: study.correlation,
        history: startHistory<Draft>({ recipe: design.recipe, correlation: design.correlation }),
      });
      autosave = createAutosave(save, (next) => set({ save: next }));
      engine = createDesignEngine({
        onLoaded(frame) {
          set({ frame });
          build();
        },
        onPhase: (phase) => {
          // during a drag the phases would only flicker
          if (!state.result) set({ buildPhase: phase });
        },
        onResult(result, isNewest) {
          const cells = result.cells ?? (hasCellsOf(result.recipe) ? state.result!.cells : null);
          set({ result: { ...result, cells }, failure: null });
          if (withCells && !cells && isNewest) build();
        },
        onFailure: (failure) => set({ failure, isBuilding: false }),
        onIdle: () => set({ isBuilding: false }),
      });
      engine.load(bytes, design.effectiveCorrelation.sphereRadiusKm);
      if (design.lastCheck) void followCheck(design.lastCheck.jobId, design.lastCheck.revision === design.revision ? state.history!.present : null);
    } catch (error) {
      set({ phase: 'failed', loadProblem: problemOf(error).detail });
    }
  };

  const setCheck = (change: Partial<CheckState>): void => set({ check: { ...state.check, ...change } });
  const followCheck = async (jobId: string, draft: Draft | null): Promise<void> => {
    checkWatch?.destroy();
    checkWatch = watchJob(
      jobId,
      (job) => {
        setCheck({ job, problem: job.state === 'failed' ? (job.error?.message ?? 'The check failed.') : null });
        if (job.state === 'complete' && job.result) {
          const result = job.result as unknown as CheckResult;
          const old: Draft | null = result.revision === state.design?.revision ? { recipe: state.design.recipe, correlation: state.design.correlation } : null;
          setCheck({ result, checked: draft ?? old ?? { recipe: {} as Recipe, correlation: null } });
        }
      },
      (message) => setCheck({ problem: `The progress could not be read (${message}). The check itself goes on; it is asked for again.` }),
    );
  };

  void load();

  return {
    getState: () => state,
    subscribe(listener) {
      listeners.add(listener);
      return () => listeners.delete(listener);
    },
    changeRecipe(change, gesture) {
      const { history } = state;
      if (!history) return;
      const { present } = history;
      const recipe = { ...present.recipe, ...change };
      for (const key of Object.keys(recipe) as (keyof Recipe)[]) if (recipe[key] === undefined) delete recipe[key];
      if (JSON.stringify(recipe) !== JSON.stringify(present.recipe)) setHistory(changeTo(history, { ...present, recipe }, gesture ?? null));
    },
    changeCorrelation(correlation, gesture) {
      const { history } = state;
      if (history) setHistory(changeTo(history, { ...history.present, correlation }, gesture ?? null));
    },
    endGesture: () => state.history && setHistory(endGesture(state.history)),
    undo: () => state.history && setHistory(undo(state.history)),
    redo: () => state.history && setHistory(redo(state.history)),
    showCells(isShown) {
      withCells = isShown;
      if (isShown) build();
    },
    async resolveConflict(choice, name) {
      const { conflict, design, history } = state;
      if (!conflict || !design || !history) return null;
      const { mine, theirs } = conflict;
      const theirDraft: Draft = { recipe: theirs.recipe, correlation: theirs.correlation };
      let newId: string | null = null;
      if (choice === 'new') {
        try {
          newId = (await api.createDesign(design.studyId, name ?? `${design.name} (copy)`, design.observationSetId, mine)).id;
        } catch (error) {
          set({ save: { kind: 'failed', reason: problemOf(error).detail } });
          return null;
        }
      }
      autosave?.resume();
      set({ design: theirs, conflict: null, save: { kind: 'saved' } });
      if (choice === 'mine') autosave?.note(mine);
      else setHistory(changeTo(history, theirDraft));
      return newId;
    },
    async startCheck() {
      setCheck({ problem: null, job: null, startedAt: Date.now() });
      if (autosave && !(await autosave.flush())) {
        setCheck({ problem: 'The design is not saved yet, so the server cannot check it. See the save state above.' });
        return;
      }
      try {
        const draft = state.history!.present;
        const job = await api.startCheck(designId);
        setCheck({ job, startedAt: Date.now() });
        await followCheck(job.id, draft);
      } catch (error) {
        setCheck({ problem: problemOf(error).detail });
      }
    },
    async cancelCheck() {
      const { job } = state.check;
      if (!job) return;
      try {
        await api.cancelJob(job.id);
      } catch (error) {
        setCheck({ problem: problemOf(error).detail });
      }
    },
    async saveVersion(note, reason) {
      set({ saving: { job: null, problem: null, versionId: null } });
      if (autosave && !(await autosave.flush())) {
        set({ saving: { job: null, problem: 'The design is not saved yet. See the save state above.', versionId: null } });
        return;
      }
      try {
        const job = await api.startSaveVersion(designId, { revision: state.design!.revision, note, ...(reason.trim() !== '' && { reason }) });
        set({ saving: { job, problem: null, versionId: null } });
        saveWatch?.destroy();
        saveWatch = watchJob(
          job.id,
          (next) =>
            set({
              saving: {
                job: next,
                problem: next.state === 'failed' ? (next.error?.message ?? 'The version could not be saved.') : null,
                versionId: next.state === 'complete' ? String(next.result?.['versionId'] ?? '') : null,
              },
            }),
          (message) => set({ saving: { ...state.saving, problem: `The progress could not be read (${message}).` } }),
        );
      } catch (error) {
        set({ saving: { job: null, problem: problemOf(error).detail, versionId: null } });
      }
    },
    clearSaving: () => set({ saving: { job: null, problem: null, versionId: null } }),
    destroy() {
      isDestroyed = true;
      checkWatch?.destroy();
      saveWatch?.destroy();
      autosave?.destroy();
      engine?.destroy();
    },
  };
};
