import { useEffect, useMemo, useState } from 'react';

import { unpackObservations } from '#core/formats/observation-bundle.ts';
import type { ObservationColumns } from '#core/design/observations.ts';
import type { SpacingCells } from '#client/design/compute-design.ts';
import { getColumnsBundle } from '#client/design/design-api.ts';
import { askWorker } from '#client/design/design-engine.ts';
import { problemOf } from '#client/design/problems.ts';
import { formatCount, formatKm } from '#client/design/words.ts';
import { describeRow, spacingCellBuffers } from '#client/map/observation-content.ts';
import type { DisplayFrame } from '#client/map/display-projection.ts';
import { createDisplayProjection, frameOf } from '#client/map/display-projection.ts';
import type { MapContent } from '#client/map/map-controller.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';

import { spacingLegend } from './legend.ts';
import { MapCanvas } from './MapCanvas.tsx';
import { MapLayers } from './MapLayers.tsx';
import { MapMessage } from './MapMessage.tsx';

interface Opened {
  columns: ObservationColumns;
  bytes: ArrayBuffer;
  frame: DisplayFrame;
  positions: Float32Array;
}

interface Spacing {
  spacingKm: Float64Array;
  cells: SpacingCells | null;
}

interface ObservationMapProps {
  observationSetId: string;
  sphereRadiusKm?: number;
  className?: string;
}

/** All rows of an observation set on a quiet map, with their local spacing as a layer. */
export const ObservationMap = ({ observationSetId, sphereRadiusKm = 6371, className = 'h-full min-h-64' }: ObservationMapProps) => {
  const [opened, setOpened] = useState<Opened | null>(null);
  const [spacing, setSpacing] = useState<Spacing | null>(null);
  const [problem, setProblem] = useState('');
  const [layers, setLayers] = useState<LayerChoice>({ elements: false, observations: true, spacing: false, effect: false, land: true });
  useEffect(() => {
    let isCurrent = true;
    getColumnsBundle(observationSetId).then(
      (bytes) => isCurrent && setOpened(open(bytes, sphereRadiusKm)),
      (error: unknown) => isCurrent && setProblem(problemOf(error).detail),
    );
    return () => {
      isCurrent = false;
    };
  }, [observationSetId, sphereRadiusKm]);
  useEffect(() => {
    if (!opened || spacing || !layers.spacing) return;
    let isCurrent = true;
    askWorker({ command: 'spacing', bytes: opened.bytes, frame: opened.frame }, 'spaced').then(
      (answer) => isCurrent && setSpacing(answer),
      (error: unknown) => isCurrent && setProblem(problemOf(error).detail),
    );
    return () => {
      isCurrent = false;
    };
  }, [opened, spacing, layers.spacing]);

  const points = useMemo(() => opened && { positions: opened.positions, share: null }, [opened]);
  const cells = useMemo(() => (spacing?.cells ? spacingCellBuffers(spacing.cells, spacing.spacingKm) : null), [spacing]);
  const content = useMemo<MapContent | null>(
    () =>
      opened && {
        frame: opened.frame,
        mesh: null,
        triangles: null,
        points,
        cells: layers.spacing ? cells : null,
        limiting: -1,
        pickable: opened.positions,
        describe: (row) => describeRow(opened.columns, row, spacing ? `local spacing ${formatKm(spacing.spacingKm[row])}` : null),
        observationIndex: (row) => row,
        bufferKm: null,
      },
    [opened, points, cells, spacing, layers.spacing],
  );
  if (!opened || !content) return <MapMessage className={className} problem={problem} waiting="Loading the observations" />;
  return (
    <MapCanvas className={className} label="Map of the observations" summary={`${formatCount(opened.columns.x.length)} observations.`} content={content} layers={layers}>
      <MapLayers
        layers={layers}
        choices={{ observations: 'Observations', spacing: 'Local spacing', ...(opened.frame.crs === 'lonlat-deg' && { land: 'Land' }) }}
        legend={layers.spacing && spacing ? spacingLegend(spacing.spacingKm) : null}
        onChange={setLayers}
      />
      {layers.spacing && !spacing && <p role="status" className="absolute bottom-3 left-3 bg-linen-raised px-2 py-1 font-mono text-xs text-ink">computing the local spacing …</p>}
      {layers.spacing && spacing && !spacing.cells && <p role="status" className="absolute bottom-3 left-3 bg-weld-wash px-2 py-1 font-mono text-xs text-ink">The observations lie on one line: their cells have no area.</p>}
      {problem !== '' && <p role="alert" className="absolute bottom-3 left-3 bg-madder-wash px-2 py-1 font-mono text-xs text-ink">{problem}</p>}
    </MapCanvas>
  );
};

const open = (bytes: ArrayBuffer, radiusKm: number): Opened => {
  const columns = unpackObservations(new Uint8Array(bytes));
  const frame = frameOf(columns.crs, columns.x, columns.y, radiusKm);
  const coordinates = new Float64Array(2 * columns.x.length);
  for (let i = 0; i < columns.x.length; i++) {
    coordinates[2 * i] = columns.x[i];
    coordinates[2 * i + 1] = columns.y[i];
  }
  return { columns, bytes, frame, positions: createDisplayProjection(frame).project(coordinates) };
};
