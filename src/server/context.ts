import type { Role } from '#schemas/people.ts';

import type { Logger } from './log.ts';

/** The signed-in person of a request. */
export interface Actor {
  userId: string;
  name: string;
  email: string;
  sessionId: string;
  mustChangePassword: boolean;
  /** Role by team id. */
  memberships: Map<string, Role>;
}

/** What a service knows of the request that calls it. */
export interface Context {
  actor: Actor | null;
  requestId: string;
  log: Logger;
  /** Address of the client, for rate limits. */
  ip: string;
}
