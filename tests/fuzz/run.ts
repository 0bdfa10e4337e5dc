import { fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import type { FuzzReport } from './decode';

/** A case that takes this long hangs: none that ends takes a second. */
const HANGS_MS = 30_000;

const { values } = parseArgs({
  options: {
    seconds: { type: 'string', default: '60' },
    cases: { type: 'string', default: 'Infinity' },
    seed: { type: 'string' },
    /** One case again, by its number. */
    case: { type: 'string' },
  },
});
const seed = values.seed === undefined ? Date.now() % 1_000_000 : Number(values.seed);
const endsAt = Date.now() + Number(values.seconds) * 1000;
const first = Number(values.case ?? 0);
const cases = values.case === undefined ? values.cases : '1';
console.log(`decoders, seed ${seed}`);

const outcome = await new Promise<FuzzReport | string>((resolve) => {
  let last = 'before the first case';
  const child = fork(
    fileURLToPath(new URL('./decodeChild.ts', import.meta.url)),
    [seed, endsAt, first, cases].map(String),
    { execArgv: ['--import', 'tsx'] },
  );
  const hangs = () => {
    child.kill('SIGKILL');
    resolve(`hangs at ${last}`);
  };
  let watchdog = setTimeout(hangs, 2 * HANGS_MS);
  child.on('message', (message: { begins?: number; name?: string; report?: FuzzReport }) => {
    clearTimeout(watchdog);
    if (message.report) {
      resolve(message.report);
      return;
    }
    last = `case ${message.begins} (${message.name})`;
    watchdog = setTimeout(hangs, HANGS_MS);
  });
  child.on('exit', (code) => resolve(`died with ${code} at ${last}`));
});
if (typeof outcome === 'string') {
  console.error(`seed ${seed}: ${outcome}`);
  process.exit(1);
}
console.log(`${outcome.cases} cases`, outcome.outcomes);
for (const failure of outcome.failures)
  console.error(`seed ${seed}, case ${failure.index} (${failure.name}): ${failure.message}`);
process.exit(outcome.failures.length > 0 ? 1 : 0);
