import { spawn } from 'node:child_process';
import { ensureBuilt } from './build.mjs';
import { ensureInstalled } from './install.mjs';
import { QUIET } from './processes.mjs';

// npm run passage -- [--json] [--model-rate HZ] FILE...: install and build what is missing, then run.
ensureInstalled();
if (!(await ensureBuilt())) process.exit(1);
const child = spawn(
  process.execPath,
  ['--import', 'tsx', 'lib/launch/passageRun.ts', ...process.argv.slice(2)],
  { stdio: 'inherit', env: { ...process.env, ...QUIET } },
);
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => child.kill(signal));
child.on('exit', (code) => process.exit(code ?? 1));
