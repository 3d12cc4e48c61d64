/** Milliseconds by phase, and the process's peak memory. */
export interface Timings {
  phases: Record<string, number>;
  totalMs: number;
  peakMemoryMb: number;
}

/** Times phases one after the other: `enter` ends the one before. */
export const createStopwatch = (): { enter: (phase: string) => void; finish: () => Timings } => {
  const start = performance.now();
  const phases: Record<string, number> = {};
  let current = '';
  let since = start;
  const enter = (phase: string): void => {
    const now = performance.now();
    if (current !== '') phases[current] = (phases[current] ?? 0) + now - since;
    current = phase;
    since = now;
  };
  return {
    enter,
    finish: () => {
      enter('');
      return { phases, totalMs: performance.now() - start, peakMemoryMb: process.resourceUsage().maxRSS / 1024 };
    },
  };
};
