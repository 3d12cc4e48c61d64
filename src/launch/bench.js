// `npm run bench [name ...]`: the benchmarks of tests/bench, one after the other.
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';

import { ROOT } from './settings.js';

const wanted = process.argv.slice(2);
const folder = path.join(ROOT, 'tests/bench');
const files = fs.readdirSync(folder, { recursive: true }).map(String).filter((name) => name.endsWith('.ts')).sort();
const chosen = files.filter((name) => wanted.length === 0 || wanted.some((word) => name.includes(word)));
if (chosen.length === 0) {
  console.error(files.length === 0 ? 'There are no benchmarks.' : `No benchmark has that in its name. There are: ${files.join(', ')}`);
  process.exitCode = 1;
}
for (const name of chosen) {
  console.log(`\n${name}`);
  const run = spawnSync(process.execPath, ['--import', 'tsx', path.join(folder, name)], { cwd: ROOT, stdio: 'inherit' });
  if (run.status !== 0) process.exitCode = 1;
}
