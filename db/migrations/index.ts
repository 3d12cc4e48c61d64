import type { Migration } from '../migrate.ts';

import { accounts } from './20261201T0900-accounts.ts';
import { studies } from './20261201T0910-studies.ts';
import { versions } from './20261201T0920-versions.ts';

/** Every migration, oldest first. */
export const migrations: Migration[] = [accounts, studies, versions];
