import { spawnSync } from 'node:child_process';
import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { ensureBuilt } from '@/lib/launch/build.mjs';
import { freePort, Household, untilAnswers } from '@/lib/launch/processes.mjs';
import { localSettings, storageFakeArgs, webArgs } from '@/lib/launch/settings.mjs';

/** Where the tests of this run find the house: written by the set-up, read by the fixtures. */
export const HOUSE_FILE = join(tmpdir(), `bellkeep-browser-house-${process.env.USER ?? 'all'}.json`);

export interface RunningHouse {
  origin: string;
  folder: string;
  signIns: Record<string, string>;
  authenticatorKey: string;
}

/** A whole house as people get it: production build, store, seed of a smaller Harrowmere. */
export default async function setUp(): Promise<() => Promise<void>> {
  if (!(await ensureBuilt())) throw new Error('the web application was not built');
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-browser-'));
  const [webPort, storagePort] = [await freePort(), await freePort()];
  const settings: Record<string, string> = {
    ...localSettings({ folder, webPort, storagePort }),
    LOG_LEVEL: 'warn',
    SEED_RECORDINGS: '40',
  };
  const household = new Household();
  const storage = household.start('the storage fake', storageFakeArgs(settings, folder));
  await untilAnswers(settings.S3_ENDPOINT ?? '', storage);
  const seeded = spawnSync(process.execPath, ['--import', 'tsx', 'db/seed/run.ts'], {
    env: { ...process.env, ...settings },
    encoding: 'utf8',
  });
  if (seeded.status !== 0) throw new Error(seeded.stderr);
  const web = household.start('the web server', webArgs(webPort), {
    env: { ...settings, NODE_ENV: 'production' },
  });
  await untilAnswers(`${settings.BELLKEEP_ORIGIN}/api/health`, web);
  const text = await readFile(join(folder, 'sign-ins.txt'), 'utf8');
  const house: RunningHouse = {
    origin: settings.BELLKEEP_ORIGIN ?? '',
    folder,
    signIns: Object.fromEntries(
      [...text.matchAll(/^\s+(\S+)@\S+\s+(\S+)/gm)].map((match) => [match[1], match[2]]),
    ),
    authenticatorKey: /authenticator key (\S+)/.exec(text)?.[1] ?? '',
  };
  await writeFile(HOUSE_FILE, JSON.stringify(house));
  return async () => {
    await household.stop();
    await rm(folder, { recursive: true, force: true });
    await rm(HOUSE_FILE, { force: true });
  };
}
