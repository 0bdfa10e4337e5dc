import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as signOutRoute } from '@/app/api/account/sign-out/route';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { POST as inviteRoute } from '@/app/api/invitations/route';
import { GET as me } from '@/app/api/me/route';
import { invitation } from '@/db/schema';
import { call, problemOf } from '@/tests/support/call';
import { signedIn, type TestPerson } from '@/tests/support/people';
import { type House, ORIGIN, openHouse } from '@/tests/support/services';

let house: House;
let admin: TestPerson & { cookie: string };
beforeEach(async () => {
  house = await openHouse();
  admin = await signedIn(house, { roles: ['itadmin'] });
});
afterEach(() => house.close());

const BODY = {
  email: 'new@harrowmere.example',
  name: 'New Person',
  jobTitle: null,
  roles: ['auditor'],
  wardIds: [],
};
const invite = (headers: Record<string, string>) =>
  call(inviteRoute, { body: BODY, cookie: admin.cookie, headers });

describe('a write with a person’s cookie', () => {
  test.each([
    ['another site', { origin: 'https://evil.example' }],
    ['our name at another port', { origin: `${ORIGIN}:8443` }],
    ['our name without TLS', { origin: ORIGIN.replace('https', 'http') }],
    ['a name that begins like ours', { origin: `${ORIGIN}.evil.example` }],
    ['a page without an origin', { origin: 'null' }],
    ['something that names no origin', { origin: '' }],
    ['a neighbour under the same domain', { origin: ORIGIN, 'sec-fetch-site': 'same-site' }],
    ['another site, by the browser’s word', { origin: ORIGIN, 'sec-fetch-site': 'cross-site' }],
    ['a page without an origin elsewhere', { origin: 'null', 'sec-fetch-site': 'cross-site' }],
  ])('is refused when it comes from %s', async (_, headers) => {
    const refused = await invite(headers);
    expect(refused.status).toBe(403);
    expect((await problemOf(refused)).code).toBe('origin-refused');
    expect(await house.services.read.select().from(invitation)).toEqual([]);
  });

  test.each([
    ['our page', { origin: ORIGIN, 'sec-fetch-site': 'same-origin' }],
    ['a browser that does not say more', { origin: ORIGIN }],
  ])('is taken when it comes from %s', async (_, headers) => {
    expect((await invite(headers)).status).toBe(201);
  });

  test('a plain form of ours is taken though it names no origin', async () => {
    const answer = await call(signOutRoute, {
      method: 'POST',
      cookie: admin.cookie,
      headers: {
        origin: 'null',
        'sec-fetch-site': 'same-origin',
        'content-type': 'application/x-www-form-urlencoded',
      },
    });
    expect(answer.status).toBe(303);
  });

  test('a form’s content type is not taken for JSON', async () => {
    const refused = await invite({ 'content-type': 'text/plain' });
    expect((await problemOf(refused)).code).toBe('media-type-unsupported');
  });

  test('another site cannot sign somebody in as itself', async () => {
    const refused = await call(signInRoute, {
      body: { email: admin.email, password: 'x' },
      headers: { origin: 'https://evil.example' },
    });
    expect((await problemOf(refused)).code).toBe('origin-refused');
  });

  test('reading needs no origin, and is answered for this site only', async () => {
    const answer = await call(me, { cookie: admin.cookie });
    expect(answer.status).toBe(200);
    expect(answer.headers.get('access-control-allow-origin')).toBeNull();
    expect(answer.headers.get('cache-control')).toBe('no-store');
    expect(answer.headers.get('x-content-type-options')).toBe('nosniff');
  });
});
