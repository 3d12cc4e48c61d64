import { useEffect, useMemo, useState } from 'react';

import type { DesignResult } from '#client/design/compute-design.ts';
import { getMeshBundle, getVersion } from '#client/design/design-api.ts';
import { askWorker } from '#client/design/design-engine.ts';
import { problemOf } from '#client/design/problems.ts';
import { formatCount, formatPercent } from '#client/design/words.ts';
import { designContent } from '#client/map/design-content.ts';
import type { DisplayFrame } from '#client/map/display-projection.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';
import type { Version } from '#schemas/versions.ts';

import { legendOf } from './legend.ts';
import { MapCanvas } from './MapCanvas.tsx';
import { MapLayers } from './MapLayers.tsx';
import { MapMessage } from './MapMessage.tsx';

interface Opened {
  version: Version;
  frame: DisplayFrame;
  result: DesignResult;
}

/** The mesh of a version. `#show=elements:1,2` in the address, or the event `selvage:show`, flies to a place. */
export const MeshMap = ({ versionId, className = 'h-full min-h-64' }: { versionId: string; className?: string }) => {
  const [opened, setOpened] = useState<Opened | null>(null);
  const [problem, setProblem] = useState('');
  const [layers, setLayers] = useState<LayerChoice>({ elements: true, observations: true, spacing: false, effect: true, land: true });
  useEffect(() => {
    let isCurrent = true;
    const open = async (): Promise<void> => {
      const [version, bytes] = await Promise.all([getVersion(versionId), getMeshBundle(versionId)]);
      const { frame, result } = await askWorker({ command: 'open', bytes, recipe: version.recipe, model: version.correlation }, 'opened', [bytes]);
      if (isCurrent) setOpened({ version, frame, result });
    };
    open().catch((error: unknown) => isCurrent && setProblem(problemOf(error).detail));
    return () => {
      isCurrent = false;
    };
  }, [versionId]);

  const content = useMemo(() => (opened ? designContent(opened.frame, opened.result, opened.version.correlation, layers) : null), [opened, layers]);
  if (!opened || !content) return <MapMessage className={className} problem={problem} waiting="Loading the mesh" />;
  const { figures } = opened.result;
  const { correlation, number } = opened.version;
  const worst = figures[correlation.normalisation === 'exact' ? 'correlation' : 'variance'];
  return (
    <MapCanvas
      className={className}
      label={`Map of the mesh of version ${number}`}
      summary={`${formatCount(figures.observations)} observations on ${formatCount(figures.nodes)} nodes and ${formatCount(figures.elements)} elements. Largest predicted boundary effect ${formatPercent(worst.value)} at observation ${worst.observation}.`}
      content={content}
      layers={layers}
    >
      <MapLayers
        layers={layers}
        choices={{ elements: 'Elements', observations: 'Observations', effect: 'Boundary effect', ...(opened.frame.crs === 'lonlat-deg' && { land: 'Land' }) }}
        legend={legendOf(layers, opened.result, correlation)}
        onChange={setLayers}
      />
    </MapCanvas>
  );
};
