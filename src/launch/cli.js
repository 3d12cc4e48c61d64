// `npm run --silent selvage -- <verb>`: the built command line when the build is of the present sources, else its sources.
import { spawn } from 'node:child_process';
import path from 'node:path';

import { freshBuild } from './build.js';
import { ROOT } from './settings.js';

const build = freshBuild();
const program = build === undefined ? ['--import', import.meta.resolve('tsx'), path.join(ROOT, 'src/cli/main.ts')] : ['--enable-source-maps', path.join(build, 'cli/main.js')];
// npm runs scripts in the checkout; INIT_CWD is where the person stands, which file names are relative to.
const child = spawn(process.execPath, [...program, ...process.argv.slice(2)], { cwd: process.env.INIT_CWD ?? process.cwd(), stdio: 'inherit' });
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => child.kill(signal));
child.on('exit', (code) => process.exit(code ?? 1));
