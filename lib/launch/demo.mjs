import { spawn } from 'node:child_process';
import { existsSync, mkdirSync, openSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { ensureBuilt } from './build.mjs';
import { ensureInstalled } from './install.mjs';
import { freePort, Household, QUIET, untilAnswers } from './processes.mjs';
import { localSettings, storageFakeArgs, webArgs } from './settings.mjs';

// npm run demo: Harrowmere General Hospital on this machine, from nothing.
const FOLDER = join(process.cwd(), '.data');
const PORTS = join(FOLDER, 'ports.json');

function run(args, env) {
  return new Promise((resolve, reject) => {
    const child = spawn(process.execPath, args, {
      stdio: ['ignore', 2, 2],
      env: { ...process.env, ...QUIET, ...env },
    });
    child.on('exit', (code) =>
      code === 0 ? resolve() : reject(new Error(`${args.slice(2).join(' ')} ended with ${code}`)),
    );
  });
}

/** The ports of the last start where they are free, so that addresses and enrolled devices stay valid. */
async function choosePorts() {
  const before = existsSync(PORTS) ? JSON.parse(readFileSync(PORTS, 'utf8')) : { web: 4360, storage: 4361 };
  const ports = { web: await freePort(before.web), storage: await freePort(before.storage) };
  mkdirSync(FOLDER, { recursive: true });
  writeFileSync(PORTS, JSON.stringify(ports));
  return ports;
}

ensureInstalled();
const started = Date.now();
const ports = await choosePorts();
const settings = localSettings({ folder: FOLDER, webPort: ports.web, storagePort: ports.storage });
const env = { ...settings, NODE_ENV: 'production' };
const household = new Household();
let leaving = false;
const leave = async (code) => {
  if (leaving) return;
  leaving = true;
  await household.stop();
  process.exit(code);
};
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => leave(0));

try {
  const log = openSync(join(FOLDER, 'demo.log'), 'a');
  const storage = household.start('the storage fake', storageFakeArgs(settings, FOLDER));
  const [built] = await Promise.all([
    ensureBuilt(),
    untilAnswers(`${settings.S3_ENDPOINT}`, storage).then(() =>
      run(['--import', 'tsx', 'db/seed/run.ts'], env),
    ),
  ]);
  if (!built) throw new Error('The web application was not built.');
  const web = household.start('the web server', webArgs(ports.web), { env, log });
  await untilAnswers(`${settings.BELLKEEP_ORIGIN}/api/health`, web);
  await run(['--import', 'tsx', 'db/seed/fleet.ts'], env);
  household.start(
    'the simulated fleet',
    [
      '--import',
      'tsx',
      'devices/fleet/cli.ts',
      '--origin',
      settings.BELLKEEP_ORIGIN,
      '--codes',
      join(FOLDER, 'fleet-codes.json'),
      '--state',
      join(FOLDER, 'fleet'),
      '--pace',
      '4',
      '--seed',
      '7',
    ],
    { log },
  );
  console.log(
    readFileSync(join(FOLDER, 'sign-ins.txt'), 'utf8').replaceAll('{origin}', settings.BELLKEEP_ORIGIN),
  );
  console.log(`Ready in ${((Date.now() - started) / 1000).toFixed(0)} s at ${settings.BELLKEEP_ORIGIN}`);
  console.log(
    'The log is in .data/demo.log, mail in .data/mail. Ctrl C ends it; remove .data to begin anew.',
  );
  const ended = await Promise.race([
    storage.ended.then(() => 'The storage fake'),
    web.ended.then(() => 'The web server'),
  ]);
  if (!leaving) throw new Error(`${ended} ended. See .data/demo.log`);
} catch (error) {
  if (!leaving) console.error(error instanceof Error ? error.message : error);
  await leave(1);
}
