import pino from 'pino';

/** A structured logger: `log.info({ jobId }, 'Job started')`. */
export type Logger = pino.Logger;

const SECRETS = ['password', 'currentPassword', 'newPassword', 'oneTimePassword', 'token', 'secret', 'cookie', 'authorization', 'set-cookie'];

/**
 * A logger that writes one JSON object a line.
 * Values under the names of secrets are replaced, at the top level and one level below.
 * @param destination where lines go; standard output when absent
 */
export function createLogger(
  options: { level?: string; name?: string } = {},
  destination?: { write(line: string): void },
): Logger {
  const settings: pino.LoggerOptions = {
    level: options.level ?? process.env['SELVAGE_LOG_LEVEL'] ?? 'info',
    base: options.name === undefined ? {} : { process: options.name },
    timestamp: pino.stdTimeFunctions.isoTime,
    formatters: { level: (label) => ({ level: label }) },
    redact: {
      paths: SECRETS.flatMap((name) => [`["${name}"]`, `*["${name}"]`, `*.headers["${name}"]`]),
      censor: '[redacted]',
    },
  };
  return pino(settings, destination ?? standardOutput());
}

/** Not pino's own writer: with two lines pending at exit and a reader that is gone, its last flush tries for ever. Lines for nobody are dropped. */
function standardOutput(): { write(line: string): void } {
  if (!process.stdout.listeners('error').includes(dropLine)) process.stdout.on('error', dropLine);
  return process.stdout;
}

function dropLine(): void {}

let root: Logger | undefined;

/** The logger of this process. */
export function getLog(): Logger {
  root ??= createLogger(process.env['SELVAGE_PROCESS'] === undefined ? {} : { name: process.env['SELVAGE_PROCESS'] });
  return root;
}
