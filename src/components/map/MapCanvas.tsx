import { Canvas, useFrame, useThree } from '@react-three/fiber';
import type { ReactNode, RefObject } from 'react';
import { useEffect, useId, useImperativeHandle, useRef, useState } from 'react';
import type { OrthographicCamera } from 'three';

import type { BoundaryDrag, MapContent, MapController } from '#client/map/map-controller.ts';
import { createMapController } from '#client/map/map-controller.ts';
import type { LayerChoice } from '#client/map/map-scene.ts';
import { mapStats } from '#client/map/map-stats.ts';
import type { Place } from '#client/map/place.ts';
import { readPlace, SHOW_EVENT } from '#client/map/place.ts';

interface MapCanvasProps {
  label: string;
  /** What the picture shows, in words, for those who do not see it. */
  summary: string;
  content: MapContent | null;
  layers: LayerChoice;
  boundaryDrag?: BoundaryDrag;
  className?: string;
  /** Over the map's corners. */
  children?: ReactNode;
}

interface SceneProps extends Pick<MapCanvasProps, 'content' | 'layers'> {
  host: RefObject<HTMLDivElement | null>;
  tip: RefObject<HTMLDivElement | null>;
  bar: RefObject<HTMLDivElement | null>;
  drag: RefObject<BoundaryDrag | undefined>;
  handle: RefObject<MapController | null>;
  onLandProblem(message: string): void;
}

const Scene = ({ host, tip, bar, drag, content, layers, handle, onLandProblem }: SceneProps) => {
  const camera = useThree((state) => state.camera);
  const renderer = useThree((state) => state.gl);
  const root = useThree((state) => state.scene);
  const invalidate = useThree((state) => state.invalidate);
  const size = useThree((state) => state.size);
  const [controller, setController] = useState<MapController | null>(null);

  useEffect(() => {
    if (!host.current || !tip.current || !bar.current) return;
    const made = createMapController({
      element: host.current,
      tip: tip.current,
      scaleBar: bar.current,
      camera: camera as OrthographicCamera,
      renderer,
      requestFrame: () => invalidate(),
      boundaryDrag: () => drag.current,
      onLandProblem,
    });
    root.add(made.scene.group);
    handle.current = made;
    setController(made);
    return () => {
      root.remove(made.scene.group);
      handle.current = null;
      made.destroy();
    };
  }, [camera, renderer, root, invalidate, host, tip, bar, drag, handle, onLandProblem]);

  useEffect(() => controller?.resized(), [controller, size]);
  useEffect(() => {
    if (content) controller?.update(content, layers);
  }, [controller, content, layers]);
  useEffect(() => {
    if (!controller) return;
    const fromHash = (): void => {
      const place = readPlace(location.hash);
      if (place) controller.show(place);
    };
    const fromEvent = (event: Event): void => controller.show((event as CustomEvent<Place>).detail);
    fromHash();
    window.addEventListener('hashchange', fromHash);
    window.addEventListener(SHOW_EVENT, fromEvent);
    return () => {
      window.removeEventListener('hashchange', fromHash);
      window.removeEventListener(SHOW_EVENT, fromEvent);
    };
  }, [controller]);
  useFrame(() => controller?.drawing());
  return null;
};

const probeWebGl = (): { isThere: boolean; isSoftware: boolean } => {
  const context = document.createElement('canvas').getContext('webgl2');
  const extension = context?.getExtension('WEBGL_debug_renderer_info');
  const name = context && extension ? String(context.getParameter(extension.UNMASKED_RENDERER_WEBGL)) : '';
  context?.getExtension('WEBGL_lose_context')?.loseContext();
  return { isThere: context !== null, isSoftware: /swiftshader|llvmpipe|software|basic render/i.test(name) };
};

/** A focusable map; what is drawn and how it moves is the controller's, React only mounts it. */
export const MapCanvas = ({ label, summary, content, layers, boundaryDrag, className = '', children }: MapCanvasProps) => {
  const host = useRef<HTMLDivElement>(null);
  const tip = useRef<HTMLDivElement>(null);
  const bar = useRef<HTMLDivElement>(null);
  const drag = useRef<BoundaryDrag | undefined>(boundaryDrag);
  const handle = useRef<MapController | null>(null);
  const [landProblem, setLandProblem] = useState('');
  const [webGl] = useState(probeWebGl);
  const summaryId = useId();
  useImperativeHandle(drag, () => boundaryDrag, [boundaryDrag]);
  useEffect(() => void mapStats().commits++);

  if (!webGl.isThere)
    return (
      <div className={`grid place-items-center bg-linen-sunk p-6 ${className}`}>
        <p className="max-w-prose font-prose text-ink">
          This browser cannot draw the map because WebGL 2 is switched off or missing. {summary} All figures and controls beside the map work without it.
        </p>
      </div>
    );
  return (
    <div className={`relative overflow-hidden bg-linen-raised ${className}`}>
      <div
        ref={host}
        tabIndex={0}
        role="application"
        aria-roledescription="map"
        aria-label={label}
        aria-describedby={summaryId}
        className="absolute inset-0 touch-none outline-none after:pointer-events-none after:absolute after:inset-0 after:z-20 focus-visible:after:outline-3 focus-visible:after:-outline-offset-3 focus-visible:after:outline-woad"
      >
        <div aria-hidden="true" className="pointer-events-none absolute inset-0">
          {/* without a graphics processor smoothing costs half the frames */}
          <Canvas orthographic flat frameloop="demand" dpr={webGl.isSoftware ? 1 : [1, 2]} gl={{ antialias: !webGl.isSoftware, alpha: true }} camera={{ position: [0, 0, 10], near: 0.1, far: 100, zoom: 1 }}>
            <Scene host={host} tip={tip} bar={bar} drag={drag} handle={handle} content={content} layers={layers} onLandProblem={setLandProblem} />
          </Canvas>
        </div>
        <div ref={tip} role="status" hidden className="pointer-events-none absolute top-0 left-0 z-10 flex max-w-72 flex-col border border-line-strong bg-linen-raised px-2.5 py-1.5 font-mono text-xs text-ink tabular-nums shadow-sm" />
        <div aria-hidden="true" className="pointer-events-none absolute right-3 bottom-3 bg-linen-raised/80 px-1.5 pt-0.5 pb-1.5">
          <div ref={bar} className="border-x border-b border-ink pb-0.5 text-center font-mono text-[0.6875rem] text-ink" />
        </div>
      </div>
      <p id={summaryId} className="sr-only">
        {summary} Arrow keys go from node to node, with Shift they move the map; plus and minus zoom, 0 shows everything, Escape leaves the node.
      </p>
      <div className="absolute top-3 right-3 flex flex-col border border-line-strong bg-linen-raised font-mono text-ink">
        <MapButton label="Zoom in" onPress={() => handle.current?.zoomBy(1.6)}>+</MapButton>
        <MapButton label="Zoom out" onPress={() => handle.current?.zoomBy(1 / 1.6)}>−</MapButton>
        <MapButton label="Show everything" onPress={() => handle.current?.fit()}>□</MapButton>
      </div>
      {landProblem !== '' && <p role="status" className="absolute right-3 bottom-12 bg-weld-wash px-2 py-1 text-xs text-ink">{landProblem}</p>}
      {children}
    </div>
  );
};

const MapButton = ({ label, onPress, children }: { label: string; onPress(): void; children: ReactNode }) => (
  <button type="button" aria-label={label} title={label} onClick={onPress} className="grid size-8 place-items-center border-line not-first:border-t hover:bg-linen-sunk focus-visible:outline-2 focus-visible:outline-woad">
    {children}
  </button>
);
