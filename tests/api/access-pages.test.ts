import { readdir } from 'node:fs/promises';
import { join, resolve } from 'node:path';
import { afterAll, beforeAll, beforeEach, describe, expect, test, vi } from 'vitest';
import { may, type Permission, ROLES, type Role } from '@/lib/identity/permissions';
import { accessOf, ROUTES, type RouteKey } from '@/lib/identity/routes';
import { addPerson, sessionOf, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

/** The request that a page finds, and what it asked for. */
const page = vi.hoisted(() => ({
  headers: new Headers(),
  asked: [] as { permission: string; ok: boolean }[],
}));

vi.mock('next/headers', () => ({
  headers: async () => page.headers,
  cookies: async () => ({ get: () => undefined }),
}));
vi.mock('@/lib/http/page', async (original) => {
  const real = await original<typeof import('@/lib/http/page')>();
  return {
    ...real,
    requirePage: async (permission: Permission, options?: { beforeSecondFactor?: boolean }) => {
      const asked = { permission, ok: false };
      page.asked.push(asked);
      const granted = await real.requirePage(permission, options);
      asked.ok = true;
      return granted;
    },
  };
});

const PARAMS = { id: 'not-there', number: 'NOTT-HERE', kind: 'person', token: 'not-there', type: 'stale' };
const pageKeys = (Object.keys(ROUTES) as RouteKey[]).filter((key) => key.startsWith('PAGE '));
const guarded = pageKeys.filter((key) => accessOf(key).permission);
const files = new Map<string, string>();

let house: House;
const people = new Map<Role, TestPerson>();
let bare: TestPerson;

beforeAll(async () => {
  house = await openHouse();
  for (const role of ROLES) people.set(role, await addPerson(house, { roles: [role] }));
  bare = await addPerson(house, { roles: ['itadmin'], secondFactor: false });
  for (const entry of await readdir('app', { recursive: true, withFileTypes: true })) {
    if (entry.name !== 'page.tsx') continue;
    const parts = entry.parentPath.split('/').slice(1);
    const address = `/${parts.filter((part) => !/^\(.*\)$/.test(part)).join('/')}`;
    files.set(`PAGE ${address}`, resolve(join(entry.parentPath, entry.name)));
  }
});
afterAll(() => house.close());
beforeEach(() => {
  page.asked.length = 0;
});

type Outcome = 'drawn' | 'not found' | `to ${string}`;

/** Draw a page for somebody, and say where they end. */
async function visit(key: RouteKey, person: TestPerson | undefined): Promise<Outcome> {
  page.headers = new Headers({ 'x-bellkeep-path': '/where?they=were' });
  if (person) page.headers.set('cookie', await sessionOf(house, person));
  const module = (await import(/* @vite-ignore */ files.get(key) ?? 'none')) as {
    default: (props: unknown) => Promise<unknown>;
  };
  try {
    await module.default({ params: Promise.resolve(PARAMS), searchParams: Promise.resolve({}) });
    return 'drawn';
  } catch (error) {
    // Next's own way of leaving a page: an error whose digest says where to.
    const { digest = '' } = error as { digest?: string };
    if (digest === 'NEXT_HTTP_ERROR_FALLBACK;404') return 'not found';
    const [kind, , target] = digest.split(';');
    if (kind === 'NEXT_REDIRECT') return `to ${target}`;
    throw error;
  }
}

describe.each(guarded)('%s', (key) => {
  const permission = accessOf(key).permission ?? 'self';

  test('asks for the permission of its line first', async () => {
    await visit(key, undefined);
    expect(page.asked[0]?.permission).toBe(permission);
  });

  test('sends whoever is signed out to sign in, and back again', async () => {
    expect(await visit(key, undefined)).toBe(`to /sign-in?next=${encodeURIComponent('/where?they=were')}`);
  });

  test.each(ROLES)('opens to %s exactly where the table says so', async (role) => {
    const outcome = await visit(key, people.get(role));
    const opened = page.asked[0]?.ok === true;
    expect(opened).toBe(may([role], permission));
    if (!opened) expect(outcome).toBe('not found');
    else expect(outcome).not.toMatch(/^to \/(sign-in|account)/);
  });

  test('is shut to an administrator without a second factor unless it is where one sets it up', async () => {
    const outcome = await visit(key, bare);
    if (accessOf(key).beforeSecondFactor) expect(outcome).toBe('drawn');
    else expect(outcome).toBe('to /account?second-factor=required');
  });
});

describe.each(pageKeys.filter((key) => accessOf(key).public))('%s', (key) => {
  test('asks nobody for anything', async () => {
    const outcome = await visit(key, undefined);
    expect(page.asked).toEqual([]);
    if (key !== 'PAGE /') expect(outcome).toBe('drawn');
  });
});

describe('the front door', () => {
  test.each([
    ['biomed', '/bench'],
    ['clinician', '/bedside'],
    ['itadmin', '/keyroom'],
    ['auditor', '/ledger'],
  ] as const)('leads %s to their own room', async (role, room) => {
    expect(await visit('PAGE /', people.get(role))).toBe(`to ${room}`);
  });

  test('leads whoever is signed out to sign in', async () => {
    expect(await visit('PAGE /', undefined)).toBe('to /sign-in');
  });
});

describe('the page to sign in', () => {
  const next = async (value: string) => {
    page.headers = new Headers({ cookie: await sessionOf(house, people.get('auditor') ?? bare) });
    const module = (await import(/* @vite-ignore */ files.get('PAGE /sign-in') ?? 'none')) as {
      default: (props: unknown) => Promise<unknown>;
    };
    try {
      await module.default({ searchParams: Promise.resolve({ next: value }) });
      return 'drawn';
    } catch (error) {
      return (error as { digest: string }).digest.split(';')[2];
    }
  };

  test('leads back to an address of ours', async () => {
    expect(await next('/ledger?q=7K3F')).toBe('/ledger?q=7K3F');
  });

  test.each([
    'https://evil.example',
    '//evil.example',
    '/\\evil.example',
    'javascript:alert(1)',
    '\t//evil.example',
    '/\t/evil.example',
    '/\n\\evil.example',
    '/..//evil.example',
  ])('leads to the front door instead of %s', async (value) => {
    expect(await next(value)).toBe('/');
  });
});
