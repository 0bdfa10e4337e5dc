import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as forgotRoute } from '@/app/api/auth/forgot/route';
import { GET as me } from '@/app/api/me/route';
import { clientAddress } from '@/lib/http/clientAddress';
import { call, problemOf } from '@/tests/support/call';
import { signedIn } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
beforeEach(async () => {
  house = await openHouse();
});
afterEach(() => house.close());

describe('a person who calls without end', () => {
  test('is told what is left, and at 600 a minute to wait', async () => {
    const { cookie } = await signedIn(house, { roles: ['auditor'] });
    const first = await call(me, { cookie });
    expect(first.headers.get('ratelimit-policy')).toBe('"person";q=600;w=60');
    expect(first.headers.get('ratelimit')).toMatch(/^"person";r=599;t=\d+$/);
    for (let i = 0; i < 599; i++) await call(me, { cookie });
    const refused = await call(me, { cookie });
    expect(refused.status).toBe(429);
    expect((await problemOf(refused)).code).toBe('too-many-requests');
    expect(Number(refused.headers.get('retry-after'))).toBeGreaterThan(0);
    expect(refused.headers.get('ratelimit')).toMatch(/^"person";r=0;t=\d+$/);
    const other = await signedIn(house, { roles: ['auditor'] });
    expect((await call(me, { cookie: other.cookie })).status).toBe(200);
  });
});

describe('an address that calls without end', () => {
  test('waits before it may write more without a session, while others go on', async () => {
    const forgot = (from: string) =>
      call(forgotRoute, { body: { email: 'nobody@harrowmere.example' }, from });
    for (let i = 0; i < 120; i++) expect((await forgot('198.51.100.9')).status).toBe(200);
    expect((await forgot('198.51.100.9')).status).toBe(429);
    expect((await forgot('198.51.100.10')).status).toBe(200);
  });
});

describe('the address of a caller', () => {
  const from = (proxies: number, forwarded: string) =>
    clientAddress(
      { env: { ...house.services.env, TRUSTED_PROXIES: proxies } },
      new Request('https://bellkeep.test', { headers: { 'x-forwarded-for': forwarded } }),
    );

  // The server writes the peer as the last entry itself; what stands before it is the caller's word.
  test.each([
    [0, '192.0.2.7', '192.0.2.7'],
    [0, '203.0.113.66, 192.0.2.7', '192.0.2.7'],
    [1, '192.0.2.7, 10.0.0.1', '192.0.2.7'],
    [1, '203.0.113.66, 192.0.2.7, 10.0.0.1', '192.0.2.7'],
    [2, '203.0.113.66, 192.0.2.7, 10.0.0.2, 10.0.0.1', '192.0.2.7'],
  ])('behind %i trusted proxies is not the one it makes up in %s', (proxies, forwarded, address) => {
    expect(from(proxies, forwarded)).toBe(address);
  });
});
