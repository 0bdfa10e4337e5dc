import { spawn } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { QUIET } from './processes.mjs';

const STAMP = '.next/bellkeep-built';
const SOURCES = [
  'app',
  'components',
  'db',
  'lib',
  'public',
  'next.config.mjs',
  'postcss.config.mjs',
  'proxy.ts',
  'instrumentation.ts',
  'package-lock.json',
  'tsconfig.json',
];

function* filesOf(path) {
  if (!existsSync(path)) return;
  if (!statSync(path).isDirectory()) return yield path;
  for (const name of readdirSync(path).sort()) yield* filesOf(join(path, name));
}

function sourceHash() {
  const hash = createHash('sha256');
  for (const path of SOURCES.flatMap((source) => [...filesOf(source)]))
    hash.update(path).update('\0').update(readFileSync(path));
  return hash.digest('hex');
}

/** Build the web application when its sources changed since the last build. @returns whether it is built */
export async function ensureBuilt() {
  const hash = sourceHash();
  if (existsSync(STAMP) && readFileSync(STAMP, 'utf8') === hash) return true;
  console.error('Building …');
  const child = spawn(process.execPath, ['node_modules/next/dist/bin/next', 'build'], {
    stdio: ['ignore', 'pipe', 'pipe'],
    env: { ...process.env, NODE_ENV: 'production', NEXT_TELEMETRY_DISABLED: '1', ...QUIET },
  });
  let said = '';
  child.stdout.on('data', (text) => {
    said += text;
  });
  child.stderr.on('data', (text) => {
    said += text;
  });
  const code = await new Promise((resolve) => child.on('exit', resolve));
  if (code !== 0) {
    console.error(said);
    console.error('The build did not succeed: see above.');
    return false;
  }
  writeFileSync(STAMP, hash);
  return true;
}
