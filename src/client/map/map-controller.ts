import type { OrthographicCamera, WebGLRenderer } from 'three';

import type { DisplayFrame, DisplayProjection } from './display-projection.ts';
import { createDisplayProjection } from './display-projection.ts';
import { distanceOutside, distanceToSegments } from './boundary-drag.ts';
import { loadLand } from './land.ts';
import type { CellBuffers, LayerChoice, MapScene, PointBuffers } from './map-scene.ts';
import { createMapScene } from './map-scene.ts';
import { countUploads, mapStats } from './map-stats.ts';
import type { MapView } from './map-view.ts';
import { createMapView } from './map-view.ts';
import type { Box, MeshBuffers } from './mesh-buffers.ts';
import { boxOf } from './mesh-buffers.ts';
import type { Picker } from './pick.ts';
import { createPicker } from './pick.ts';
import type { Place } from './place.ts';
import { scaleBar } from './scale-bar.ts';
import { readThemeColours, watchTheme } from './theme-colours.ts';

/** What a map shows. Parts that are the same object as before are not uploaded again. */
export interface MapContent {
  frame: DisplayFrame;
  mesh: MeshBuffers | null;
  /** Three nodes per element, for places. */
  triangles: Uint32Array | null;
  points: PointBuffers | null;
  cells: CellBuffers | null;
  /** Point with the largest effect, or -1. */
  limiting: number;
  /** What pointer and keyboard find: nodes of the mesh, or the points. */
  pickable: Float32Array;
  /** Title and lines about what was found. */
  describe(index: number): { title: string; lines: string[] };
  /** Index in `pickable` of an observation. */
  observationIndex(observation: number): number;
  /** Buffer of the mesh, km, for the counters. */
  bufferKm: number | null;
}

export interface BoundaryDrag {
  onStart(): void;
  /** Buffer in km that puts the boundary under the pointer. */
  onBuffer(km: number): void;
  onEnd(): void;
}

export interface MapParts {
  /** Focusable, around canvas and the other parts. */
  element: HTMLElement;
  tip: HTMLElement;
  scaleBar: HTMLElement;
  camera: OrthographicCamera;
  renderer: WebGLRenderer;
  requestFrame(): void;
  boundaryDrag?: () => BoundaryDrag | undefined;
  onLandProblem(message: string): void;
}

export interface MapController {
  scene: MapScene;
  update(content: MapContent, layers: LayerChoice): void;
  show(place: Place): void;
  fit(): void;
  zoomBy(factor: number): void;
  resized(): void;
  /** Before every frame. */
  drawing(): void;
  destroy(): void;
}

const GRAB_PX = 9;
const REACH_PX = 22;
const ARROWS: Record<string, [number, number]> = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1] };

/** Joins scene, view, picking, keyboard, tooltip and scale bar of one map; nothing here renders React. */
export const createMapController = (parts: MapParts): MapController => {
  const { element, tip, renderer, requestFrame } = parts;
  const stats = mapStats();
  countUploads(renderer.getContext());
  const scene = createMapScene(requestFrame);
  let content: MapContent | null = null;
  let projection: DisplayProjection | null = null;
  let picker: Picker | null = null;
  let cursor = -1;
  let isKeyboard = false;
  let awaited: Place | null = null;
  let landKey = '';
  let undrawnBuffer: number | null = null;

  const setTip = (): void => {
    if (cursor < 0 || !content) {
      tip.hidden = true;
      scene.setCursor(null);
      return;
    }
    const x = content.pickable[2 * cursor], y = content.pickable[2 * cursor + 1];
    scene.setCursor([x, y]);
    const { title, lines } = content.describe(cursor);
    const heading = document.createElement('strong');
    heading.textContent = title;
    tip.replaceChildren(heading, ...lines.map((line) => {
      const row = document.createElement('span');
      row.textContent = line;
      return row;
    }));
    tip.hidden = false;
    placeTip(x, y);
  };
  const placeTip = (x: number, y: number): void => {
    const [px, py] = view.toPixels(x, y);
    const left = px + 16 + tip.offsetWidth > element.clientWidth ? px - 16 - tip.offsetWidth : px + 16;
    const top = Math.min(Math.max(8, py - tip.offsetHeight / 2), Math.max(8, element.clientHeight - tip.offsetHeight - 8));
    tip.style.transform = `translate(${Math.round(Math.max(8, left))}px, ${Math.round(top)}px)`;
  };

  const bar = parts.scaleBar;
  const onView = (): void => {
    scene.setZoom(view.view.zoom, renderer.getPixelRatio());
    const scale = projection ? projection.scaleAt(view.view.x, view.view.y) : 1;
    const { pixels, label } = scaleBar(view.view.zoom * scale, Math.min(160, element.clientWidth / 3));
    bar.style.width = `${pixels.toFixed(1)}px`;
    if (bar.textContent !== label) bar.textContent = label;
    if (cursor >= 0 && content) placeTip(content.pickable[2 * cursor], content.pickable[2 * cursor + 1]);
  };

  const isAtBoundary = (x: number, y: number): boolean =>
    parts.boundaryDrag?.() !== undefined && content?.mesh !== null && content !== null && distanceToSegments(x, y, content.mesh!.boundary) * view.view.zoom <= GRAB_PX;

  const view: MapView = createMapView({
    element,
    camera: parts.camera,
    requestFrame,
    onView: () => onView(),
    onHover(at) {
      isKeyboard = false;
      element.style.cursor = at && isAtBoundary(at.x, at.y) ? 'move' : '';
      const found = at && picker ? picker.near(at.x, at.y, REACH_PX / view.view.zoom) : -1;
      if (found === cursor) return;
      cursor = found;
      setTip();
    },
    onClick(at) {
      cursor = picker ? picker.near(at.x, at.y, REACH_PX / view.view.zoom) : -1;
      setTip();
    },
    onPress(at) {
      if (!isAtBoundary(at.x, at.y)) return false;
      cursor = -1;
      setTip();
      parts.boundaryDrag?.()?.onStart();
      return true;
    },
    onGrabMove(at) {
      if (!content?.mesh || !projection) return;
      const km = distanceOutside(at.x, at.y, content.mesh.outline) / projection.scaleAt(at.x, at.y);
      parts.boundaryDrag?.()?.onBuffer(km);
    },
    onGrabEnd: () => parts.boundaryDrag?.()?.onEnd(),
  });

  const wholeBox = (): Box | null => {
    if (!content) return null;
    const positions = content.mesh ? content.mesh.boundary : (content.points?.positions ?? content.pickable);
    return positions.length > 0 ? boxOf(positions) : null;
  };
  const fit = (isInstant = false): void => {
    const box = wholeBox();
    if (box) view.flyTo(grow(box, box.east - box.west + box.north - box.south > 0 ? 0 : 1), { isInstant });
  };
  const grow = (box: Box, by: number): Box => ({ west: box.west - by, south: box.south - by, east: box.east + by, north: box.north + by });

  const handleKey = (event: KeyboardEvent): void => {
    if (event.ctrlKey || event.metaKey || event.altKey || event.target !== element) return;
    const arrow = ARROWS[event.key];
    if (arrow && event.shiftKey) view.panBy(-60 * arrow[0], 60 * arrow[1]);
    else if (arrow && picker && content) {
      const next = cursor < 0 ? picker.near(view.view.x, view.view.y, Infinity) : picker.step(cursor, arrow[0], arrow[1]);
      if (next >= 0) cursor = next;
      isKeyboard = true;
      setTip();
      keepInSight();
    } else if (event.key === '+' || event.key === '=') view.zoomBy(1.4);
    else if (event.key === '-') view.zoomBy(1 / 1.4);
    else if (event.key === '0' || event.key === 'Home') fit();
    else if (event.key === 'Escape' && cursor >= 0) {
      cursor = -1;
      setTip();
    } else return;
    event.preventDefault();
  };
  const keepInSight = (): void => {
    if (cursor < 0 || !content) return;
    const [px, py] = view.toPixels(content.pickable[2 * cursor], content.pickable[2 * cursor + 1]);
    const margin = 40;
    const over = (p: number, most: number): number => (p < margin ? margin - p : p > most - margin ? most - margin - p : 0);
    const dx = over(px, element.clientWidth), dy = over(py, element.clientHeight);
    if (dx !== 0 || dy !== 0) view.panBy(dx, dy);
  };
  const handleBlur = (): void => {
    if (!isKeyboard) return;
    cursor = -1;
    setTip();
  };
  element.addEventListener('keydown', handleKey);
  element.addEventListener('blur', handleBlur);

  const theme = (): void => scene.setTheme(readThemeColours());
  theme();
  const themeWatch = watchTheme(theme);

  const show = (place: Place): void => {
    if (!content || (place.elements && !content.triangles)) {
      awaited = place;
      return;
    }
    const { pickable, triangles } = content;
    const count = pickable.length / 2;
    const corners = (place.elements ?? []).filter((e) => triangles && 3 * e + 2 < triangles.length).flatMap((e) => [...triangles!.subarray(3 * e, 3 * e + 3)]);
    const nodes = [...(place.nodes ?? []), ...(place.observations ?? []).map((i) => content!.observationIndex(i))].filter((i) => i >= 0 && i < count);
    const at = (list: number[]): Float32Array => Float32Array.from(list.flatMap((i) => [pickable[2 * i], pickable[2 * i + 1]]));
    if (corners.length + nodes.length === 0) return;
    // a small element is found by the ring about it
    const middles = Float32Array.from({ length: (2 * corners.length) / 3 }, (_, k) => {
      const e = 3 * (k >> 1);
      return (pickable[2 * corners[e] + (k & 1)] + pickable[2 * corners[e + 1] + (k & 1)] + pickable[2 * corners[e + 2] + (k & 1)]) / 3;
    });
    scene.setPlace({ triangles: at(corners), points: Float32Array.from([...at(nodes), ...middles]) });
    const all = [...corners, ...nodes];
    const box = boxOf(at(all));
    view.flyTo(grow(box, 6 * Math.max(...all.slice(0, 50).map((i) => picker?.spacing(i) ?? 0), 1e-6)));
    cursor = nodes.length === 1 && corners.length === 0 ? nodes[0] : -1;
    setTip();
  };

  const updateLand = (frame: DisplayFrame, box: Box | null): void => {
    const reachKm = box ? Math.hypot(Math.max(-box.west, box.east), Math.max(-box.south, box.north)) : 0;
    const key = JSON.stringify([frame, Math.ceil(Math.log2(Math.max(reachKm, 1)))]);
    if (key === landKey || !box) return;
    landKey = key;
    loadLand(frame, reachKm).then(
      (land) => {
        if (landKey === key) scene.setLand(land);
      },
      () => parts.onLandProblem('The land could not be loaded; the map is drawn without it.'),
    );
  };

  return {
    scene,
    update(next, layers) {
      const before = content;
      content = next;
      if (next.frame !== before?.frame) projection = createDisplayProjection(next.frame);
      if (next.mesh !== before?.mesh) {
        scene.setMesh(next.mesh);
        undrawnBuffer = next.bufferKm;
        scene.setPlace(null);
      }
      if (next.points !== before?.points) scene.setPoints(next.points);
      if (next.cells !== before?.cells) scene.setCells(next.cells);
      if (next.limiting !== before?.limiting || next.points !== before?.points)
        scene.setLimiting(next.limiting >= 0 && next.points ? [next.points.positions[2 * next.limiting], next.points.positions[2 * next.limiting + 1]] : null);
      if (next.pickable !== before?.pickable) {
        picker = createPicker(next.pickable);
        cursor = -1;
        setTip();
      }
      scene.setLayers(layers);
      if (!before) fit(true);
      onView();
      updateLand(next.frame, wholeBox());
      if (awaited && (!awaited.elements || next.triangles)) {
        const place = awaited;
        awaited = null;
        show(place);
      }
    },
    show,
    fit: () => fit(),
    zoomBy: (factor) => view.zoomBy(factor),
    resized: () => view.resized(),
    drawing() {
      stats.frames++;
      if (undrawnBuffer !== null) stats.drawnBuffers.push(undrawnBuffer);
      undrawnBuffer = null;
    },
    destroy() {
      landKey = '';
      themeWatch.destroy();
      element.removeEventListener('keydown', handleKey);
      element.removeEventListener('blur', handleBlur);
      view.destroy();
      scene.destroy();
    },
  };
};
