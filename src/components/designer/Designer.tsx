import { useCallback, useEffect, useMemo, useState } from 'react';

import { resolveScale } from '#core/correlation/scale.ts';
import type { SessionState } from '#client/design/design-session.ts';
import { isCheckOld, modelOf } from '#client/design/design-session.ts';
import { roundBuffer } from '#client/design/margin-scale.ts';
import { formatCount, formatKm, marginSentence } from '#client/design/words.ts';
import { designContent } from '#client/map/design-content.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';
import { mapStats } from '#client/map/map-stats.ts';
import { MapCanvas } from '#components/map/MapCanvas.tsx';
import { MapLayers } from '#components/map/MapLayers.tsx';
import { legendOf } from '#components/map/legend.ts';

import { CheckPanel } from './CheckPanel.tsx';
import { ConflictPanel } from './ConflictPanel.tsx';
import { DesignBar } from './DesignBar.tsx';
import { MarginStrip } from './MarginStrip.tsx';
import { ModelControls } from './ModelControls.tsx';
import { ReadOuts } from './ReadOuts.tsx';
import { RecipeControls } from './RecipeControls.tsx';
import { SaveVersionDialog } from './SaveVersionDialog.tsx';
import { SelectionControls } from './SelectionControls.tsx';
import { useSession } from './use-session.ts';

interface DesignerProps {
  designId: string;
  /** False for viewers: everything can be seen, nothing changed. */
  canEdit?: boolean;
}

const CHOICES = { elements: 'Elements', observations: 'Observations', effect: 'Boundary effect', spacing: 'Local spacing' } as const;

/** The designer of one design: map, margin strip, recipe, figures, check. */
export const Designer = ({ designId, canEdit = true }: DesignerProps) => {
  const held = useSession(designId);
  if (!held || held.state.phase === 'loading') return <Waiting words="Loading the design and its observations" />;
  const { session, state } = held;
  if (state.phase === 'failed')
    return (
      <div className="m-4 border-l-4 border-madder bg-madder-wash p-4 text-ink" role="alert">
        <p className="font-mono font-semibold">The design cannot be opened</p>
        <p className="mt-1 font-prose">{state.loadProblem}</p>
        <button type="button" className="mt-3 border border-line-strong bg-linen-raised px-3 py-1.5 font-mono text-xs" onClick={() => location.reload()}>Try again</button>
      </div>
    );
  return <Workbench session={session} state={state} isReadOnly={!canEdit} />;
};

const Waiting = ({ words }: { words: string }) => (
  <div role="status" className="grid min-h-96 place-items-center bg-linen-raised font-mono text-sm text-ink-soft">{words} …</div>
);

type Held = NonNullable<ReturnType<typeof useSession>>;

const Workbench = ({ session, state, isReadOnly }: Held & { isReadOnly: boolean }) => {
  const [layers, setLayers] = useState<LayerChoice>({ elements: true, observations: true, spacing: false, effect: true, land: true });
  const [isSaving, setIsSaving] = useState(false);
  const { result, frame } = state;
  const recipe = state.history!.present.recipe;
  const model = modelOf(state)!;
  const set = state.set!;

  const content = useMemo(() => (frame && result ? designContent(frame, result, model, layers) : null), [frame, result, model, layers]);
  const boundaryDrag = useMemo(
    () =>
      isReadOnly
        ? undefined
        : {
            onStart: () => session.endGesture(),
            onBuffer: (km: number) => session.changeRecipe({ bufferKm: roundBuffer(Math.max(km, recipe.bufferKm / 20)) }, 'boundary-map'),
            onEnd: () => session.endGesture(),
          },
    [session, isReadOnly, recipe.bufferKm],
  );
  const changeLayers = useCallback(
    (next: LayerChoice): void => {
      setLayers(next);
      session.showCells(next.spacing);
    },
    [session],
  );
  const openDialog = useCallback((): void => setIsSaving(true), []);
  useUndoKeys(session, isReadOnly);
  useEffect(() => void mapStats().commits++);

  const worst = result ? result.figures[model.normalisation === 'exact' ? 'correlation' : 'variance'] : null;
  const sentence = marginSentence({ bufferKm: recipe.bufferKm, ...resolveScale(model), worst: worst?.value ?? null, observation: worst?.observation ?? 0, tolerance: model.tolerance });
  const isOld = isCheckOld(state);

  return (
    <div className="flex flex-col">
      <DesignBar state={state} session={session} isReadOnly={isReadOnly} />
      {state.conflict && (
        <ConflictPanel
          {...state.conflict}
          onChoose={(choice, name) =>
            void session.resolveConflict(choice, name).then((newId) => {
              if (newId) location.assign(`/designs/${newId}`);
            })
          }
        />
      )}
      <ReadOuts result={result} model={model} />
      <div className="grid lg:grid-cols-[minmax(0,1fr)_22rem]">
        <div className="flex min-w-0 flex-col lg:sticky lg:top-0 lg:h-[calc(100vh-11.5rem)] lg:min-h-[40rem] lg:self-start">
          {content ? (
            <MapCanvas label={`Map of the mesh of ${state.design!.name}`} summary={mapSummary(state, sentence)} content={content} layers={layers} boundaryDrag={boundaryDrag} className="min-h-[22rem] flex-1">
              <MapLayers layers={layers} choices={{ ...CHOICES, ...(frame?.crs === 'lonlat-deg' && { land: 'Land' }) }} legend={legendOf(layers, result, model)} onChange={changeLayers} />
              {state.failure && <Failure state={state} />}
            </MapCanvas>
          ) : state.failure ? (
            <div className="relative min-h-96 flex-1 bg-linen-sunk"><Failure state={state} /></div>
          ) : (
            <Waiting words={`Building the mesh: ${state.buildPhase}`} />
          )}
          <MarginStrip
            model={model}
            bufferKm={recipe.bufferKm}
            coreSpacingKm={recipe.coreSpacingKm ?? result?.mesh.coreSpacingKm ?? recipe.bufferKm / 20}
            growth={recipe.growth}
            corners={recipe.corners}
            turning={result?.figures.worstTurning ?? 0}
            worst={worst?.value ?? null}
            sentence={sentence}
            isReadOnly={isReadOnly}
            onBuffer={(bufferKm, gesture) => session.changeRecipe({ bufferKm }, gesture)}
            onDone={() => session.endGesture()}
          />
        </div>
        <div className="border-line-strong bg-linen max-lg:border-t lg:max-h-[calc(100vh-11.5rem)] lg:min-h-[40rem] lg:overflow-y-auto lg:border-l" role="group" aria-label="Recipe and check">
          <RecipeControls recipe={recipe} result={result} isReadOnly={isReadOnly} onChange={session.changeRecipe} onDone={session.endGesture} />
          <SelectionControls set={set} selection={recipe.selection} brief={result ? `${formatCount(result.figures.observations)} of ${formatCount(result.figures.rows)} rows` : ''} isReadOnly={isReadOnly} onChange={session.changeRecipe} onDone={session.endGesture} />
          <ModelControls model={model} isOwn={state.history!.present.correlation !== null} isReadOnly={isReadOnly} onChange={session.changeCorrelation} onDone={session.endGesture} />
          <CheckPanel check={state.check} isOld={isOld} isReadOnly={isReadOnly} onCheck={session.startCheck} onCancel={session.cancelCheck} onSave={openDialog} />
        </div>
      </div>
      {isSaving && (
        <SaveVersionDialog
          findings={isOld ? null : (state.check.result?.findings ?? null)}
          saving={state.saving}
          onSave={(note, reason) => void session.saveVersion(note, reason)}
          onClose={() => {
            setIsSaving(false);
            session.clearSaving();
          }}
        />
      )}
    </div>
  );
};

const Failure = ({ state }: { state: SessionState }) => (
  <div role="alert" className="absolute inset-x-4 bottom-4 border-l-4 border-madder bg-madder-wash p-3 text-ink">
    <p className="font-mono text-sm font-semibold">No mesh for this recipe</p>
    <p className="mt-1 font-prose">{state.failure!.message}</p>
    {state.result && <p className="mt-1 font-prose text-sm text-ink-soft">The map still shows the last mesh that could be built, with a buffer of {formatKm(state.result.recipe.bufferKm)}.</p>}
  </div>
);

const mapSummary = (state: SessionState, sentence: string): string => {
  const figures = state.result?.figures;
  return figures ? `${formatCount(figures.observations)} observations on a mesh of ${formatCount(figures.nodes)} nodes and ${formatCount(figures.elements)} elements. ${sentence}` : sentence;
};

const useUndoKeys = (session: Held['session'], isReadOnly: boolean): void => {
  useEffect(() => {
    if (isReadOnly) return;
    const handleKey = (event: KeyboardEvent): void => {
      if (!(event.ctrlKey || event.metaKey) || event.altKey) return;
      const key = event.key.toLowerCase();
      const isText = event.target instanceof HTMLTextAreaElement;
      if (isText || (key !== 'z' && key !== 'y')) return;
      event.preventDefault();
      if (key === 'y' || event.shiftKey) session.redo();
      else session.undo();
    };
    window.addEventListener('keydown', handleKey);
    return () => window.removeEventListener('keydown', handleKey);
  }, [session, isReadOnly]);
};
