/**
 * Keeps only the newest of the requests that came since the last run, and runs it when `schedule` calls back: in a
 * worker, whose messages wait while it computes, a macrotask later all that waited have come, and the newest wins.
 */
export const createLatestTask = <T>(run: (request: T) => void, schedule: (task: () => void) => void): ((request: T) => void) => {
  let wanted: { request: T } | null = null;
  return (request) => {
    const isScheduled = wanted !== null;
    wanted = { request };
    if (isScheduled) return;
    schedule(() => {
      const { request: newest } = wanted!;
      wanted = null;
      run(newest);
    });
  };
};
