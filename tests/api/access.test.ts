import { readFileSync } from 'node:fs';
import { readdir } from 'node:fs/promises';
import { join, resolve } from 'node:path';
import { afterAll, beforeAll, describe, expect, test, vi } from 'vitest';
import { may, PERMISSIONS, ROLES, type Role } from '@/lib/identity/permissions';
import { accessOf, ROUTES, type RouteKey } from '@/lib/identity/routes';
import { call, type Handler, problemOf } from '@/tests/support/call';
import { addPerson, sessionOf, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

/** Where a file of `app/` answers: its folders without the groups in round brackets. */
const addressOf = (file: string): string =>
  `/${file
    .split('/')
    .slice(1, -1)
    .filter((part) => !/^\(.*\)$/.test(part))
    .join('/')}`;

const METHODS = ['GET', 'HEAD', 'POST', 'PUT', 'PATCH', 'DELETE', 'OPTIONS'] as const;
const keys = Object.keys(ROUTES) as RouteKey[];
const apiKeys = keys.filter((key) => !key.startsWith('PAGE '));
const routeFile = new Map<string, string>();
const VISITORS = ['signed out', ...ROLES] as const;
type Visitor = (typeof VISITORS)[number];

/** Something for each parameter of an address; nothing in the house has it. */
const PARAMS = { id: 'not-there', number: 'NOTT-HERE', kind: 'person', token: 'not-there', type: 'stale' };

async function filesOf(folder: string, name: RegExp): Promise<string[]> {
  const entries = await readdir(folder, { recursive: true, withFileTypes: true });
  return entries
    .filter((entry) => entry.isFile() && name.test(entry.name))
    .map((entry) => join(entry.parentPath, entry.name))
    .sort();
}

const handlerOf = async (key: RouteKey): Promise<Handler & { routeKey?: string }> => {
  const [method = '', address = ''] = key.split(' ');
  const module = (await import(/* @vite-ignore */ resolve(routeFile.get(address) ?? 'none'))) as Record<
    string,
    Handler
  >;
  const handler = module[method];
  if (!handler) throw new Error(`${address} has no ${method}`);
  return handler;
};

let house: House;
const people = new Map<Role, TestPerson>();

beforeAll(async () => {
  house = await openHouse();
  for (const role of ROLES) people.set(role, await addPerson(house, { roles: [role] }));
  for (const file of await filesOf('app', /^route\.ts$/)) routeFile.set(addressOf(file), file);
});
afterAll(() => house.close());

/** A fresh session each time: some routes end the one they are called with. */
async function cookieOf(visitor: Visitor): Promise<string> {
  const person = visitor === 'signed out' ? undefined : people.get(visitor);
  return person ? await sessionOf(house, person) : '';
}

async function callAs(visitor: Visitor, key: RouteKey) {
  const method = key.startsWith('GET ') ? 'GET' : 'POST';
  house.log.length = 0;
  const answer = await call(await handlerOf(key), {
    method,
    params: PARAMS,
    cookie: await cookieOf(visitor),
    ...(method === 'POST' ? { body: {} } : {}),
  });
  const denied = house.log.some((line) => line.includes('NotPermitted'));
  return { answer, denied };
}

describe('the table of routes', () => {
  test('lists every page and every method of every route, and nothing that is not there', async () => {
    const found: string[] = [];
    for (const file of await filesOf('app', /^page\.tsx$/)) found.push(`PAGE ${addressOf(file)}`);
    for (const [address, file] of routeFile) {
      const module = (await import(/* @vite-ignore */ resolve(file))) as Record<string, unknown>;
      for (const method of METHODS) if (module[method]) found.push(`${method} ${address}`);
    }
    expect(found.sort()).toEqual([...keys].sort());
  });

  test('has each route of people call itself by its own line', async () => {
    for (const key of apiKeys) {
      const access = accessOf(key);
      if (access.permission) expect((await handlerOf(key)).routeKey).toBe(key);
    }
  });

  test('has a permission, everybody, a device or another system in each line, and only one of them', () => {
    for (const key of keys) {
      const { permission, public: everybody, device, client } = accessOf(key);
      expect([permission, everybody, device, client].filter(Boolean), key).toHaveLength(1);
    }
  });

  test('is all there is: no server action answers beside it', async () => {
    const folders = ['app', 'components', 'lib'];
    const sources = (await Promise.all(folders.map((folder) => filesOf(folder, /\.tsx?$/)))).flat();
    expect(sources.length).toBeGreaterThan(100);
    expect(sources.filter((file) => /['"]use server['"]/.test(readFileSync(file, 'utf8')))).toEqual([]);
  });
});

describe.each(apiKeys.filter((key) => accessOf(key).permission))('%s', (key) => {
  const permission = accessOf(key).permission ?? 'self';

  test.each(VISITORS)('answers %s as the table says', async (visitor) => {
    const { answer, denied } = await callAs(visitor, key);
    if (visitor === 'signed out') {
      expect((await problemOf(answer)).code).toBe('sign-in-required');
      return;
    }
    expect(denied).toBe(!may([visitor], permission));
    if (denied) expect((await problemOf(answer)).code).toBe('not-found');
    else expect([401, 403, 405, 500]).not.toContain(answer.status);
    await answer.body?.cancel().catch(() => undefined);
  });
});

describe.each(apiKeys.filter((key) => accessOf(key).device))('%s', (key) => {
  test.each(VISITORS)('is not for %s', async (visitor) => {
    const { answer } = await callAs(visitor, key);
    expect(answer.status).toBe(401);
    expect((await problemOf(answer)).code).toBe('token-invalid');
  });
});

describe.each(apiKeys.filter((key) => accessOf(key).client))('%s', (key) => {
  test.each(VISITORS)('is not for %s', async (visitor) => {
    const { answer } = await callAs(visitor, key);
    expect(answer.status).toBe(401);
    expect((await problemOf(answer)).code).toBe('access-token-refused');
  });
});

describe.each(apiKeys.filter((key) => accessOf(key).public))('%s', (key) => {
  test('asks nobody to sign in', async () => {
    const { answer } = await callAs('signed out', key);
    const body = await answer.text();
    expect(body).not.toContain('sign-in-required');
    expect(answer.status).not.toBe(500);
  });
});

describe('what one may not see', () => {
  test('answers like what is not there', async () => {
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    const denied = await callAs('clinician', 'GET /api/people/[id]');
    const missing = await callAs('itadmin', 'GET /api/people/[id]');
    expect([denied.denied, missing.denied]).toEqual([true, false]);
    expect(denied.answer.status).toBe(missing.answer.status);
    expect(await without(denied.answer)).toEqual(await without(missing.answer));
    const names = (answer: Response) => [...answer.headers.keys()].sort();
    expect(names(denied.answer)).toEqual(
      names(missing.answer).filter((name) => !name.startsWith('ratelimit')),
    );
  });

  test('opens to nobody who holds no role', async () => {
    const nobody = await addPerson(house, { roles: [] });
    for (const key of apiKeys.filter((one) => accessOf(one).permission && one.startsWith('GET '))) {
      const answer = await call(await handlerOf(key), {
        params: PARAMS,
        cookie: await sessionOf(house, nobody),
      });
      expect(answer.status, key).toBe(404);
    }
  });

  test('stays shut to an administrator without a second factor, but for setting one up', async () => {
    const bare = await addPerson(house, { roles: ['itadmin'], secondFactor: false });
    for (const key of apiKeys.filter((one) => accessOf(one).permission)) {
      const access = accessOf(key);
      if (!may(['itadmin'], access.permission ?? 'self')) continue;
      const answer = await call(await handlerOf(key), {
        method: key.startsWith('GET ') ? 'GET' : 'POST',
        params: PARAMS,
        cookie: await sessionOf(house, bare),
        ...(key.startsWith('GET ') ? {} : { body: {} }),
      });
      const refused = answer.status === 403 && (await problemOf(answer)).code === 'second-factor-required';
      expect(refused, key).toBe(access.beforeSecondFactor !== true);
    }
  });
});

test('every permission is held by some role', () => {
  for (const [permission, roles] of Object.entries(PERMISSIONS))
    expect(roles.length, permission).toBeGreaterThan(0);
});

vi.setConfig({ testTimeout: 60_000 });
