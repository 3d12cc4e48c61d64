import type { Migration } from '../migrate.ts';

/** Every migration, oldest first. */
export const migrations: Migration[] = [];
