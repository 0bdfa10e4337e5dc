import { spawn } from 'node:child_process';
import { ensureBuilt } from './build.mjs';
import { ensureInstalled } from './install.mjs';
import { QUIET } from './processes.mjs';

// npm run fleet -- …: a fleet for a service that runs, or, with --rotate and no address, one with a house of its own.
ensureInstalled();
const args = process.argv.slice(2);
const alone = !args.some((arg) => arg === '--origin' || arg.startsWith('--origin=') || arg === '--help');
if (alone && !(await ensureBuilt())) process.exit(1);
const child = spawn(
  process.execPath,
  ['--import', 'tsx', alone ? 'lib/launch/fleetRun.ts' : 'devices/fleet/cli.ts', ...args],
  { stdio: 'inherit', env: { ...process.env, ...QUIET } },
);
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => child.kill(signal));
child.on('exit', (code) => process.exit(code ?? 1));
