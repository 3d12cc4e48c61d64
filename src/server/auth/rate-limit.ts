import { QueryTypes } from 'sequelize';

import { getDatabase } from '../database.ts';
import { AppError } from '../errors.ts';

export interface RateLimit {
  /** Requests allowed per window. */
  limit: number;
  windowSeconds: number;
}

/** Wrong passwords per account, and tries per address. */
export const SIGN_IN_LIMITS = {
  account: { limit: 10, windowSeconds: 900 },
  address: { limit: 100, windowSeconds: 900 },
} as const satisfies Record<string, RateLimit>;

const windowStart = (now: number, seconds: number): Date => new Date(Math.floor(now / (1000 * seconds)) * 1000 * seconds);

/** Counts one request under `key`; the count holds for all processes of the database. @throws AppError RATE_LIMITED with Retry-After */
export const countRequest = async (key: string, { limit, windowSeconds }: RateLimit): Promise<void> => {
  const now = Date.now();
  const start = windowStart(now, windowSeconds);
  const [row] = await getDatabase().query<{ count: number }>(
    `INSERT INTO rate_limits (key, window_start, count) VALUES (:key, :start, 1)
     ON CONFLICT (key, window_start) DO UPDATE SET count = rate_limits.count + 1 RETURNING count`,
    { replacements: { key, start }, type: QueryTypes.SELECT },
  );
  if (row && row.count <= limit) return;
  const wait = Math.max(1, Math.ceil((start.getTime() + 1000 * windowSeconds - now) / 1000));
  throw new AppError('RATE_LIMITED', `There were too many tries. Wait ${Math.ceil(wait / 60)} minutes and try again.`, {
    headers: { 'retry-after': String(wait) },
  });
};

/** Forgets the count of a key, and of all windows that are over. */
export const forgetRequests = async (key: string): Promise<void> => {
  await getDatabase().query(`DELETE FROM rate_limits WHERE key = :key OR window_start < now() - interval '1 day'`, { replacements: { key } });
};
