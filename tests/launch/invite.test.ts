import { execFile } from 'node:child_process';
import { randomBytes } from 'node:crypto';
import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as acceptRoute } from '@/app/api/invitations/accept/route';
import { openDatabase } from '@/db/client';
import { createServices, provideServices } from '@/lib/http/services';
import { readEnv } from '@/lib/platform/env';
import type { Services } from '@/lib/platform/services';
import { call } from '../support/call';
import { entriesOf } from '../support/entries';
import { PASSWORD } from '../support/people';
import { ORIGIN } from '../support/services';

let folder: string;
let env: Record<string, string>;
beforeEach(async () => {
  folder = await mkdtemp(join(tmpdir(), 'bellkeep-invite-'));
  env = {
    BELLKEEP_ORIGIN: ORIGIN,
    BELLKEEP_SECRET_KEY: randomBytes(32).toString('base64'),
    BELLKEEP_AUTH_SECRET: randomBytes(32).toString('base64'),
    DATABASE_URL: `file:${join(folder, 'house.db')}`,
    S3_ENDPOINT: 'http://127.0.0.1:9',
    S3_BUCKET: 'bellkeep',
    S3_ACCESS_KEY_ID: 'KEY',
    S3_SECRET_ACCESS_KEY: 'SECRET',
  };
});
afterEach(() => rm(folder, { recursive: true, force: true }));

interface Ran {
  code: number;
  out: string;
  said: string;
}
/** The command as npm runs it, in a process of its own. */
const invite = (...args: string[]): Promise<Ran> =>
  new Promise((resolve) => {
    execFile(
      process.execPath,
      ['--import', 'tsx', 'lib/launch/invite.ts', ...args],
      { env: { NODE_ENV: 'test', PATH: process.env.PATH ?? '', ...env } },
      (error, out, said) => resolve({ code: error ? Number(error.code) : 0, out, said }),
    );
  });
const ROWAN = ['--email', 'Rowan@Harrowmere.example', '--name', 'Rowan Field'];

async function inHouse<T>(work: (services: Services) => Promise<T>): Promise<T> {
  const services = await createServices(readEnv({ ...env, LOG_LEVEL: 'silent' }), {
    database: await openDatabase(env.DATABASE_URL ?? ''),
  });
  provideServices(services);
  try {
    return await work(services);
  } finally {
    services.database.close();
  }
}
const accept = (out: string) => {
  const token = out.trim().split('/').at(-1) ?? '';
  return call(acceptRoute, { body: { token, password: PASSWORD } });
};

describe('npm run invite', () => {
  test('prints an address by which the first IT administrator joins a new house', async () => {
    const { code, out, said } = await invite(...ROWAN, '--role', 'itadmin');
    expect([code, said.includes('Rowan Field')]).toEqual([0, true]);
    expect(out).toMatch(new RegExp(`^${ORIGIN}/invite/[\\w-]{43}\\n$`));
    await inHouse(async (services) => {
      const answer = await accept(out);
      expect(await answer.json()).toEqual({ email: 'rowan@harrowmere.example' });
      const [person] = await services.read.query.user.findMany();
      expect(person).toMatchObject({ name: 'Rowan Field', leftAt: null });
      expect((await accept(out)).status).toBe(404);
      expect(await entriesOf({ services })).toEqual(
        expect.arrayContaining([
          expect.objectContaining({
            kind: 'person-invited',
            actor: expect.objectContaining({ kind: 'service' }),
            detail: expect.objectContaining({ how: 'command', forced: false }),
          }),
        ]),
      );
    });
  });

  test('refuses while one is invited or here, unless forced; the log then says so', async () => {
    const first = await invite(...ROWAN);
    expect((await invite('--email', 'b@harrowmere.example', '--name', 'B')).code).toBe(1);
    await inHouse(() => accept(first.out));
    const again = await invite('--email', 'b@harrowmere.example', '--name', 'B');
    expect([again.code, again.out]).toEqual([1, '']);
    expect(again.said).toContain('--force');
    const forced = await invite('--email', 'b@harrowmere.example', '--name', 'B', '--force');
    expect(forced.code).toBe(0);
    await inHouse(async (services) => {
      const entry = (await entriesOf({ services })).at(-1);
      expect(entry).toMatchObject({ kind: 'person-invited', detail: { forced: true } });
    });
  });

  test('refuses somebody who has an account', async () => {
    const first = await invite(...ROWAN);
    await inHouse(() => accept(first.out));
    const again = await invite(...ROWAN, '--force');
    expect([again.code, again.said.includes('has an account')]).toEqual([1, true]);
  });

  test.each([
    [['--email', 'nobody', '--name', 'N'], '--email takes'],
    [['--email', 'a@b.example'], '--name is needed'],
    [['--email', 'a@b.example', '--name', 'N', '--role', 'king'], '--role is one of'],
    [['--what'], 'npm run invite'],
  ])('says what is wrong with %j and touches nothing', async (args, words) => {
    const { code, said } = await invite(...args);
    expect([code, said.includes(words)]).toEqual([2, true]);
  });
});
