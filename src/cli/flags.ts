import { readFile } from 'node:fs/promises';
import { parseArgs } from 'node:util';

/** The command line is wrong; the message says how to write it. */
export class UsageError extends Error {}

export type Flags = Partial<Record<string, string>>;

/** Flags `--name value` of a verb, by name. @throws UsageError for an unknown one */
export const parseFlags = (argv: string[], names: readonly string[]): Flags => {
  const options = Object.fromEntries([...names, 'out'].map((name) => [name, { type: 'string' as const }]));
  try {
    return parseArgs({ args: argv, options, strict: true, allowPositionals: false }).values as Flags;
  } catch (error) {
    throw new UsageError(`${error instanceof Error ? error.message : String(error)}. "selvage help" lists the flags.`);
  }
};

/** A flag that has to be given. @throws UsageError */
export const required = (flags: Flags, name: string): string => {
  const value = flags[name];
  if (value === undefined) throw new UsageError(`--${name} is missing. "selvage help" tells what it takes.`);
  return value;
};

/** A flag's number, or undefined when it is not given. @throws UsageError */
export const numberFlag = (flags: Flags, name: string): number | undefined => {
  const text = flags[name];
  if (text === undefined) return undefined;
  const value = Number(text);
  if (text.trim() === '' || !Number.isFinite(value)) throw new UsageError(`--${name} takes a number; "${text}" is none.`);
  return value;
};

/** The bytes of a file. @throws UsageError naming flag and file */
export const readBytes = async (flag: string, file: string): Promise<Uint8Array> => {
  try {
    return new Uint8Array(await readFile(file));
  } catch (error) {
    throw new UsageError(`The file of --${flag}, ${file}, cannot be read: ${error instanceof Error ? error.message : String(error)}`);
  }
};

/** The JSON of a file. @throws UsageError naming flag and file */
export const readJson = async (flag: string, file: string): Promise<unknown> => {
  const bytes = await readBytes(flag, file);
  try {
    return JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(bytes));
  } catch (error) {
    throw new UsageError(`The file of --${flag}, ${file}, is not JSON: ${error instanceof Error ? error.message : String(error)}`);
  }
};
