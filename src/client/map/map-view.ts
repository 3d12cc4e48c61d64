import type { OrthographicCamera } from 'three';

import type { Box } from './mesh-buffers.ts';

export interface View {
  /** Middle of the picture, map kilometres. */
  x: number;
  y: number;
  /** Pixels per map kilometre. */
  zoom: number;
}

export interface MapViewOptions {
  element: HTMLElement;
  camera: OrthographicCamera;
  requestFrame(): void;
  /** After every change of the view; must be cheap. */
  onView(view: View): void;
  /** The pointer without a button, map kilometres and pixels of the element; null when it left. */
  onHover(at: { x: number; y: number; px: number; py: number } | null): void;
  onClick(at: { x: number; y: number }): void;
  /** True takes the press (a grabbed boundary): the map is not panned, and `onGrabMove`, `onGrabEnd` follow. */
  onPress?(at: { x: number; y: number }): boolean;
  onGrabMove?(at: { x: number; y: number }): void;
  onGrabEnd?(): void;
}

export interface MapView {
  /** Shows a box with a margin, gliding there unless motion is to be reduced. */
  flyTo(box: Box, options?: { most?: number; isInstant?: boolean }): void;
  zoomBy(factor: number, at?: { px: number; py: number }): void;
  panBy(dx: number, dy: number): void;
  readonly view: View;
  /** Map kilometres to pixels of the element. */
  toPixels(x: number, y: number): [number, number];
  /** After the element changed its size. */
  resized(): void;
  destroy(): void;
}

const GLIDE_MS = 450;
const CLICK_PX = 4;

/** Pans, zooms and flies by the camera alone. */
export const createMapView = (options: MapViewOptions): MapView => {
  const { element, camera, requestFrame } = options;
  const view: View = { x: 0, y: 0, zoom: 1 };
  const pointers = new Map<number, { px: number; py: number }>();
  let limits = { least: 1e-6, most: 1e6 };
  let pressed: { px: number; py: number; moved: boolean; grabbed: boolean } | null = null;
  let glide = 0;
  let wanted: Box | null = null;

  const apply = (): void => {
    camera.position.set(view.x, view.y, 10);
    camera.zoom = view.zoom;
    camera.updateProjectionMatrix();
    options.onView(view);
    requestFrame();
  };
  const size = (): { width: number; height: number } => ({ width: element.clientWidth || 1, height: element.clientHeight || 1 });
  const clampZoom = (zoom: number): number => Math.min(limits.most, Math.max(limits.least, zoom));
  const stop = (): void => {
    cancelAnimationFrame(glide);
    wanted = null;
  };
  const toMap = (px: number, py: number): { x: number; y: number } => {
    const { width, height } = size();
    return { x: view.x + (px - width / 2) / view.zoom, y: view.y - (py - height / 2) / view.zoom };
  };
  const pixelsOf = (event: PointerEvent | WheelEvent): { px: number; py: number } => {
    const box = element.getBoundingClientRect();
    return { px: event.clientX - box.left, py: event.clientY - box.top };
  };
  const zoomBy = (factor: number, at?: { px: number; py: number }): void => {
    stop();
    const { width, height } = size();
    const { px, py } = at ?? { px: width / 2, py: height / 2 };
    const before = toMap(px, py);
    view.zoom = clampZoom(view.zoom * factor);
    const after = toMap(px, py);
    view.x += before.x - after.x;
    view.y += before.y - after.y;
    apply();
  };
  const panBy = (dx: number, dy: number): void => {
    stop();
    view.x -= dx / view.zoom;
    view.y += dy / view.zoom;
    apply();
  };

  const target = (box: Box, most = Infinity): View => {
    const { width, height } = size();
    const zoom = Math.min((0.88 * width) / Math.max(box.east - box.west, 1e-9), (0.88 * height) / Math.max(box.north - box.south, 1e-9), most);
    return { x: (box.west + box.east) / 2, y: (box.south + box.north) / 2, zoom: clampZoom(zoom) };
  };
  const flyTo: MapView['flyTo'] = (box, { most, isInstant = false } = {}) => {
    stop();
    const end = target(box, most);
    if (isInstant || matchMedia('(prefers-reduced-motion: reduce)').matches) {
      Object.assign(view, end);
      wanted = box;
      return apply();
    }
    const start = { ...view };
    const began = performance.now();
    const step = (time: number): void => {
      const t = Math.min(1, Math.max(0, (time - began) / GLIDE_MS));
      const eased = t * t * (3 - 2 * t);
      view.zoom = start.zoom * (end.zoom / start.zoom) ** eased;
      // the middle moves so that a point keeps its place on a straight way through scales
      const share = Math.abs(end.zoom - start.zoom) < 1e-9 * start.zoom ? eased : (1 / start.zoom - 1 / view.zoom) / (1 / start.zoom - 1 / end.zoom);
      view.x = start.x + (end.x - start.x) * share;
      view.y = start.y + (end.y - start.y) * share;
      apply();
      if (t < 1) glide = requestAnimationFrame(step);
    };
    glide = requestAnimationFrame(step);
  };

  const handleDown = (event: PointerEvent): void => {
    if (event.button !== 0) return;
    const at = pixelsOf(event);
    stop();
    element.setPointerCapture(event.pointerId);
    pointers.set(event.pointerId, at);
    if (pointers.size === 1) pressed = { ...at, moved: false, grabbed: options.onPress?.(toMap(at.px, at.py)) ?? false };
    else if (pressed) pressed.moved = true;
  };
  const handleMove = (event: PointerEvent): void => {
    const at = pixelsOf(event);
    const before = pointers.get(event.pointerId);
    if (!before || !pressed) {
      options.onHover({ ...toMap(at.px, at.py), ...at });
      return;
    }
    if (pressed.grabbed) {
      pressed.moved = true;
      pointers.set(event.pointerId, at);
      options.onGrabMove?.(toMap(at.px, at.py));
      return;
    }
    if (Math.hypot(at.px - pressed.px, at.py - pressed.py) > CLICK_PX) pressed.moved = true;
    const others = [...pointers].filter(([id]) => id !== event.pointerId).map(([, p]) => p);
    pointers.set(event.pointerId, at);
    if (others.length === 0) {
      if (pressed.moved) panBy(at.px - before.px, at.py - before.py);
      return;
    }
    // two fingers: their distance zooms, their middle pans
    const [other] = others;
    const ratio = Math.hypot(at.px - other.px, at.py - other.py) / Math.max(1, Math.hypot(before.px - other.px, before.py - other.py));
    zoomBy(ratio, { px: (at.px + other.px) / 2, py: (at.py + other.py) / 2 });
    panBy((at.px - before.px) / 2, (at.py - before.py) / 2);
  };
  const handleUp = (event: PointerEvent): void => {
    const at = pixelsOf(event);
    if (!pointers.delete(event.pointerId) || !pressed || pointers.size > 0) return;
    if (pressed.grabbed) options.onGrabEnd?.();
    else if (!pressed.moved && event.type === 'pointerup') options.onClick(toMap(at.px, at.py));
    pressed = null;
  };
  const handleLeave = (): void => {
    if (!pressed) options.onHover(null);
  };
  const handleWheel = (event: WheelEvent): void => {
    event.preventDefault();
    zoomBy(Math.exp(-Math.max(-200, Math.min(200, event.deltaMode === 1 ? 16 * event.deltaY : event.deltaY)) * 0.0022), pixelsOf(event));
  };

  element.addEventListener('pointerdown', handleDown);
  element.addEventListener('pointermove', handleMove);
  element.addEventListener('pointerup', handleUp);
  element.addEventListener('pointercancel', handleUp);
  element.addEventListener('pointerleave', handleLeave);
  element.addEventListener('wheel', handleWheel, { passive: false });

  return {
    flyTo(box, flight) {
      const fitted = target(box);
      limits = { least: Math.min(limits.least === 1e-6 ? Infinity : limits.least, fitted.zoom / 40), most: Math.max(limits.most === 1e6 ? 0 : limits.most, fitted.zoom * 4000) };
      flyTo(box, flight);
    },
    zoomBy,
    panBy,
    view,
    toPixels(x, y) {
      const { width, height } = size();
      return [width / 2 + (x - view.x) * view.zoom, height / 2 - (y - view.y) * view.zoom];
    },
    resized() {
      // a view that was fitted stays fitted
      if (wanted) Object.assign(view, target(wanted));
      apply();
    },
    destroy() {
      stop();
      element.removeEventListener('pointerdown', handleDown);
      element.removeEventListener('pointermove', handleMove);
      element.removeEventListener('pointerup', handleUp);
      element.removeEventListener('pointercancel', handleUp);
      element.removeEventListener('pointerleave', handleLeave);
      element.removeEventListener('wheel', handleWheel);
    },
  };
};
