import { createLogger, type Logger } from '#server/log.ts';

export interface RecordingLog {
  log: Logger;
  /** What was logged, oldest first, as it would have been written. */
  entries: Record<string, unknown>[];
}

/** A logger that keeps its entries for a test to look at. */
export function createRecordingLog(): RecordingLog {
  const entries: Record<string, unknown>[] = [];
  const log = createLogger({ level: 'trace' }, { write: (line) => void entries.push(JSON.parse(line) as Record<string, unknown>) });
  return { log, entries };
}
