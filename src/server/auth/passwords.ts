import { randomBytes } from 'node:crypto';

import { hash, verify } from '@node-rs/argon2';

/** OWASP Password Storage Cheat Sheet: argon2id, 19 MiB, 2 passes, 1 lane. */
const PARAMETERS = { memoryCost: 19_456, timeCost: 2, parallelism: 1 };

/** Argon2id hash of a password, parameters and salt included. */
export const hashPassword = (password: string): Promise<string> => hash(password, PARAMETERS);

let decoy: Promise<string> | undefined;

/** Whether the password fits; without a hash (unknown person) the same work is done and the answer is no. */
export const verifyPassword = async (passwordHash: string | null, password: string): Promise<boolean> => {
  decoy ??= hashPassword(randomBytes(16).toString('hex'));
  const fits = await verify(passwordHash ?? (await decoy), password);
  return passwordHash !== null && fits;
};

/** A password for one sign-in: 96 random bits in groups that can be read aloud. */
export const makeOneTimePassword = (): string => randomBytes(12).toString('hex').replace(/(.{6})(?=.)/g, '$1-');
