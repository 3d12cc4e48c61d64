/** Counters of what the maps on a page did, read by the browser tests: `window.__selvageMapStats`. */
export interface MapStats {
  /** Calls of the graphics context that upload a vertex or index buffer. */
  bufferUploads: number;
  /** React commits of map and designer. */
  commits: number;
  frames: number;
  /** Buffer in km of every mesh drawn, in order. */
  drawnBuffers: number[];
}

declare global {
  interface Window {
    __selvageMapStats?: MapStats;
  }
}

export const mapStats = (): MapStats =>
  (window.__selvageMapStats ??= { bufferUploads: 0, commits: 0, frames: 0, drawnBuffers: [] });

/** Counts uploads at the context itself, so that no upload by whatever library goes unseen. */
export const countUploads = (context: WebGLRenderingContext | WebGL2RenderingContext): void => {
  const stats = mapStats();
  for (const name of ['bufferData', 'bufferSubData'] as const) {
    const upload = context[name].bind(context) as (...args: unknown[]) => void;
    context[name] = (...args: unknown[]) => {
      stats.bufferUploads++;
      upload(...args);
    };
  }
};
