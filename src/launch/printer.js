// Log lines of the processes: one short line for a person at a terminal, the JSON itself for a file or a pipe.

/** @returns {(line: string) => void} */
export function createPrinter(out = process.stdout) {
  if (!out.isTTY) return (line) => void out.write(`${line}\n`);
  return (line) => void out.write(`${readable(line)}\n`);
}

function readable(line) {
  let entry;
  try {
    entry = JSON.parse(line);
  } catch {
    return line;
  }
  if (typeof entry !== 'object' || entry === null || typeof entry.msg !== 'string') return line;
  const { level, time, process: name, msg, requestId, err, method, path, status, ms, ...rest } = entry;
  const clock = String(time ?? '').slice(11, 19);
  const request = path === undefined ? '' : ` ${method} ${path} ${status} in ${ms} ms`;
  const facts = Object.entries(rest).map(([key, value]) => ` ${key}=${typeof value === 'string' ? value : JSON.stringify(value)}`);
  const trouble = err?.stack === undefined ? '' : `\n${err.stack}`;
  const id = requestId !== undefined && level !== 'info' ? ` request=${requestId}` : '';
  return `${clock} ${String(level).padEnd(5)} ${name ?? ''}: ${msg}${request}${facts.join('')}${id}${trouble}`;
}
