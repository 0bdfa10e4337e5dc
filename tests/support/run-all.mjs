import { spawn, spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, readFileSync, rmSync } from 'node:fs';
import { ensureBuilt } from '../../lib/launch/build.mjs';
import { ensureInstalled } from '../../lib/launch/install.mjs';
import { QUIET } from '../../lib/launch/processes.mjs';

// npm test: everything, from a fresh clone. The last line counts what passed and failed over all suites.
const DEBIAN = {
  '/usr/bin/chromium': 'chromium',
  '/usr/bin/sox': 'sox',
  '/usr/bin/ffmpeg': 'ffmpeg',
  '/usr/bin/flac': 'flac',
  '/usr/bin/aws': 'awscli',
  '/usr/bin/s3cmd': 's3cmd',
  '/usr/bin/rclone': 'rclone',
  '/usr/lib/python3/dist-packages/boto3': 'python3-boto3',
};
const total = { passed: 0, failed: 0, skipped: 0 };
const failures = [];
const REPORTS = 'test-results';

function ensureDebianPackages() {
  const missing = Object.entries(DEBIAN)
    .filter(([path]) => !existsSync(path))
    .map(([, name]) => name);
  if (missing.length === 0) return;
  if (process.getuid?.() !== 0 || !existsSync('/usr/bin/apt-get')) {
    console.error(
      `Missing: ${missing.join(', ')}. Install them (Debian package names); without root this cannot be done here.`,
    );
    return;
  }
  console.log(`Installing ${missing.join(', ')} …`);
  const options = {
    stdio: ['ignore', 'ignore', 'inherit'],
    env: { ...process.env, DEBIAN_FRONTEND: 'noninteractive' },
  };
  spawnSync('apt-get', ['update', '-qq'], options);
  spawnSync('apt-get', ['install', '-y', '-qq', '--no-install-recommends', ...missing], options);
}

function run(command, args, env = {}) {
  return new Promise((resolve) => {
    const child = spawn(command, args, {
      stdio: ['ignore', 'inherit', 'inherit'],
      env: { ...process.env, NEXT_TELEMETRY_DISABLED: '1', ...QUIET, ...env },
    });
    child.on('exit', (code) => resolve(code ?? 1));
  });
}

/** A check that is one thing: it passed or it failed. */
async function check(name, work) {
  console.log(`\n— ${name}`);
  const ok = await work();
  total[ok ? 'passed' : 'failed']++;
  if (!ok) failures.push(name);
}

const bin = (name) => `node_modules/.bin/${name}`;

/** Add up a report; a suite that broke before it could report is one failure. */
function count(name, path, read) {
  if (!existsSync(path)) {
    total.failed++;
    failures.push(`${name} gave no report`);
    return;
  }
  const { passed, failed, skipped, names } = read(JSON.parse(readFileSync(path, 'utf8')));
  total.passed += passed;
  total.failed += failed;
  total.skipped += skipped;
  failures.push(...names);
  if (passed + failed === 0) {
    total.failed++;
    failures.push(`${name} ran no test`);
  }
}

const readVitest = (report) => ({
  passed: report.numPassedTests,
  failed:
    report.numFailedTests +
    report.testResults.filter((file) => file.status === 'failed' && file.assertionResults.length === 0)
      .length,
  skipped: report.numPendingTests + report.numTodoTests,
  names: report.testResults.flatMap((file) =>
    file.status === 'failed' && file.assertionResults.length === 0
      ? [file.name]
      : file.assertionResults.filter((test) => test.status === 'failed').map((test) => test.fullName),
  ),
});
const readPlaywright = ({ stats, errors }) => ({
  passed: stats.expected + stats.flaky,
  failed: stats.unexpected + (errors?.length ?? 0),
  skipped: stats.skipped,
  names: stats.unexpected > 0 ? [`${stats.unexpected} in a browser`] : [],
});

ensureInstalled();
ensureDebianPackages();
rmSync(REPORTS, { recursive: true, force: true });
mkdirSync(REPORTS, { recursive: true });

await check('format and lint', async () => (await run(bin('biome'), ['ci', '.'])) === 0);
await check(
  'who may import whom',
  async () =>
    (await run(bin('depcruise'), [
      'app',
      'components',
      'db',
      'lib',
      'devices',
      'storage-fake',
      'tests',
      '--config',
      '.dependency-cruiser.mjs',
    ])) === 0,
);
await check('unused code', async () => (await run(bin('knip'), [])) === 0);
await check(
  'types',
  async () => (await run(bin('next'), ['typegen'])) === 0 && (await run(bin('tsc'), ['--noEmit'])) === 0,
);
console.log('\n— unit and integration');
await run(bin('vitest'), [
  'run',
  '--reporter=default',
  '--reporter=json',
  `--outputFile.json=${REPORTS}/vitest.json`,
]);
count('unit and integration', `${REPORTS}/vitest.json`, readVitest);
await check('build', ensureBuilt);
console.log('\n— browser');
await run(bin('playwright'), ['test'], { PLAYWRIGHT_JSON_OUTPUT_NAME: `${REPORTS}/browser.json` });
count('browser', `${REPORTS}/browser.json`, readPlaywright);

for (const name of failures) console.log(`failed: ${name}`);
console.log(
  `\n${total.passed} passed, ${total.failed} failed${total.skipped > 0 ? `, ${total.skipped} skipped` : ''}`,
);
process.exit(total.failed === 0 ? 0 : 1);
