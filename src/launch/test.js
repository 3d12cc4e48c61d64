// `npm test`: lint, types, unit, reference, integration and browser tests, from a fresh clone on.
//   npm test                     everything            npm test -- --nightly    also *.nightly.test.ts
//   npm test -- unit             one suite             npm test -- unit refine  files with "refine" in their name
import { spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';

import { StartError } from '../../db/private-postgres.js';
import { ensureBuild } from './build.js';
import { checkNode, ensureChromium, ensurePackages, ensurePostgres } from './requirements.js';
import { ROOT } from './settings.js';

/** Suites in the order of the summary, with their budget in minutes on two cores. */
const SUITES = { lint: 2, types: 2, unit: 5, reference: 2, integration: 5, browser: 8 };

const args = process.argv.slice(2);
const nightly = args.includes('--nightly');
const words = args.filter((word) => !word.startsWith('--'));
const chosen = Object.keys(SUITES).filter((name) => words.includes(name));
const suites = chosen.length > 0 ? chosen : Object.keys(SUITES);
const filters = words.filter((word) => !(word in SUITES));

const running = new Set();
const results = new Map();

async function main() {
  const started = Date.now();
  checkNode();
  ensurePackages(console.log);
  const wants = (...names) => names.some((name) => suites.includes(name));
  if (wants('integration', 'browser')) ensurePostgres(console.log);
  const env = { ...process.env, ASTRO_TELEMETRY_DISABLED: '1', ASTRO_DISABLE_UPDATE_CHECK: 'true', SELVAGE_NIGHTLY: nightly ? '1' : '0', DATABASE_URL: undefined };
  if (wants('browser')) env.SELVAGE_CHROMIUM = ensureChromium(console.log);
  const reports = fs.mkdtempSync(path.join(os.tmpdir(), 'selvage-reports-'));
  try {
    const isAlone = suites.length === 1;
    const static_ = async () => {
      if (wants('lint')) await run('lint', ['node_modules/eslint/bin/eslint.js', '.', '--max-warnings=0'], { env, isQuiet: !isAlone, count: asOne });
      if (wants('types')) await run('types', ['node_modules/astro/astro.js', 'check', '--minimumFailingSeverity', 'error'], { env, isQuiet: !isAlone, count: asOne });
      if (wants('integration', 'browser')) await build(env);
    };
    const pure = async () => {
      for (const name of ['unit', 'reference']) if (wants(name)) await vitest(name, env, reports);
    };
    await Promise.all([static_(), pure()]);
    if (wants('integration')) await vitest('integration', env, reports);
    if (wants('browser')) {
      const report = path.join(reports, 'browser.json');
      await run('browser', ['node_modules/@playwright/test/cli.js', 'test', '--config', 'tests/playwright.config.ts', ...filters], {
        env: { ...env, PLAYWRIGHT_JSON_OUTPUT_NAME: report },
        count: (code) => countPlaywright(report, code),
      });
    }
  } finally {
    fs.rmSync(reports, { recursive: true, force: true });
  }
  summarise(started);
}

function vitest(name, env, reports) {
  const report = path.join(reports, `${name}.json`);
  const command = ['node_modules/vitest/vitest.mjs', 'run', '--config', 'tests/vitest.config.ts', '--project', name, '--passWithNoTests', '--reporter=default', '--reporter=json', `--outputFile.json=${report}`];
  return run(name, [...command, ...filters], { env, count: (code) => countVitest(report, code) });
}

async function build(env) {
  try {
    env.SELVAGE_TEST_BUILD = await ensureBuild(console.log);
  } catch (error) {
    console.error(error instanceof StartError ? error.message : error);
    results.set('build', { passed: 0, failed: 1, skipped: 0, minutes: 0 });
  }
}

/** Runs one suite; a quiet one is shown only when it fails. */
async function run(name, command, { env, isQuiet = false, count }) {
  const started = Date.now();
  if (!isQuiet) console.log(`\n== ${name}`);
  const child = spawn(process.execPath, command, { cwd: ROOT, env, stdio: isQuiet ? ['ignore', 'pipe', 'pipe'] : ['ignore', 'inherit', 'inherit'] });
  running.add(child);
  let text = '';
  if (isQuiet) for (const stream of [child.stdout, child.stderr]) stream.on('data', (chunk) => (text += chunk));
  const code = await new Promise((resolve) => child.once('close', (status) => resolve(status ?? 1)));
  running.delete(child);
  const counted = count(code);
  if (isQuiet) console.log(counted.failed > 0 ? `\n== ${name}\n${text.trim()}\n` : `\n== ${name}: passed`);
  results.set(name, { ...counted, minutes: (Date.now() - started) / 60_000 });
}

const asOne = (code) => (code === 0 ? { passed: 1, failed: 0, skipped: 0 } : { passed: 0, failed: 1, skipped: 0 });

/** A file that could not be loaded, and a run that ends badly without naming a failed test, count as one failure each. */
function countVitest(report, code) {
  const said = readReport(report);
  if (said === undefined) return { passed: 0, failed: 1, skipped: 0 };
  const broken = said.testResults.filter((file) => file.status === 'failed' && file.assertionResults.every((one) => one.status !== 'failed')).length;
  return settle({ passed: said.numPassedTests, failed: said.numFailedTests + broken, skipped: said.numPendingTests + said.numTodoTests }, code);
}

function countPlaywright(report, code) {
  const stats = readReport(report)?.stats;
  if (stats === undefined) return { passed: 0, failed: 1, skipped: 0 };
  // A test that passes only when tried again is not a passing test.
  return settle({ passed: stats.expected, failed: stats.unexpected + stats.flaky, skipped: stats.skipped }, code);
}

function settle(counts, code) {
  const isSilentFailure = counts.failed === 0 && (code !== 0 || counts.passed === 0);
  if (isSilentFailure) console.error(code === 0 ? 'No test was executed.' : `The runner ended with ${code} although no test failed.`);
  return isSilentFailure ? { ...counts, failed: 1 } : counts;
}

function readReport(file) {
  try {
    return JSON.parse(fs.readFileSync(file, 'utf8'));
  } catch {
    return undefined;
  }
}

function summarise(started) {
  console.log('\nsuite         passed  failed  skipped  minutes  budget');
  let passed = 0;
  let failed = 0;
  for (const name of ['build', ...Object.keys(SUITES)]) {
    const one = results.get(name);
    if (one === undefined) continue;
    passed += one.passed;
    failed += one.failed;
    const budget = SUITES[name];
    const note = budget !== undefined && one.minutes > budget && !nightly ? '  over budget' : '';
    console.log(
      `${name.padEnd(12)}${String(one.passed).padStart(8)}${String(one.failed).padStart(8)}${String(one.skipped).padStart(9)}${one.minutes.toFixed(1).padStart(9)}${String(budget ?? '').padStart(8)}${note}`,
    );
  }
  console.log(`\n${((Date.now() - started) / 60_000).toFixed(1)} minutes in all`);
  console.log(`${passed} passed, ${failed} failed`);
  process.exitCode = failed > 0 || passed === 0 ? 1 : 0;
}

for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP']) {
  process.on(signal, () => {
    for (const child of running) child.kill('SIGTERM');
    setTimeout(() => process.exit(130), 3_000).unref();
    if (running.size === 0) process.exit(130);
  });
}

main().catch((error) => {
  console.error(error instanceof StartError ? error.message : error);
  console.log('0 passed, 1 failed');
  process.exit(1);
});
