import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { call } from '@/tests/support/call';
import { addPerson, PASSWORD, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
let person: TestPerson;
beforeEach(async () => {
  house = await openHouse();
  person = await addPerson(house, { roles: ['clinician'] });
});
afterEach(() => house.close());

const HERE = '192.0.2.7';
const signIn = (password: string, from = HERE, email = person.email) =>
  call(signInRoute, { body: { email, password }, from });
const wrong = (from = HERE, email?: string) => signIn('wrong wrong wrong', from, email);

async function wrongTimes(times: number, from = HERE) {
  for (let i = 0; i < times; i++) expect((await wrong(from)).status).toBe(401);
}

describe('guessing at a password', () => {
  test('after five wrong ones even the right one has to wait, and is told how long', async () => {
    await wrongTimes(5);
    const answer = await signIn(PASSWORD);
    expect(answer.status).toBe(429);
    expect(Number(answer.headers.get('retry-after'))).toBe(30);
    expect(answer.headers.getSetCookie()).toEqual([]);
    house.clock.advance(30_000);
    expect((await signIn(PASSWORD)).status).toBe(200);
  });

  test('each further wrong one doubles the wait, up to an hour', async () => {
    await wrongTimes(5);
    const waits: number[] = [];
    for (let i = 0; i < 9; i++) {
      const refused = await wrong();
      waits.push(Number(refused.headers.get('retry-after')));
      house.clock.advance((waits.at(-1) ?? 0) * 1000);
      expect((await wrong()).status).toBe(401);
    }
    expect(waits).toEqual([30, 60, 120, 240, 480, 960, 1920, 3600, 3600]);
  });

  test('four wrong ones are forgiven by the right one', async () => {
    await wrongTimes(4);
    expect((await signIn(PASSWORD)).status).toBe(200);
    await wrongTimes(4);
    expect((await signIn(PASSWORD)).status).toBe(200);
  });

  test('somebody else’s wrong tries from elsewhere do not keep the person out', async () => {
    await wrongTimes(5, '198.51.100.1');
    expect((await wrong('198.51.100.1')).status).toBe(429);
    expect((await signIn(PASSWORD)).status).toBe(200);
  });

  test('addresses of one IPv6 network count as one', async () => {
    for (let i = 1; i <= 5; i++) expect((await wrong(`2001:db8:1:2::${i}`)).status).toBe(401);
    expect((await wrong('2001:db8:1:2:ffff::9')).status).toBe(429);
    expect((await wrong('2001:db8:1:3::1')).status).toBe(401);
  });

  test('fifty wrong ones from anywhere make everybody wait for that account', async () => {
    for (let i = 0; i < 50; i++) expect((await wrong(`198.51.100.${i}`)).status).toBe(401);
    expect((await wrong('203.0.113.1')).status).toBe(429);
    expect((await signIn(PASSWORD)).status).toBe(429);
    const other = await addPerson(house, { roles: ['auditor'] });
    expect((await signIn(PASSWORD, HERE, other.email)).status).toBe(200);
  });

  test('many at the same moment are as many tries', async () => {
    const answers = await Promise.all(Array.from({ length: 12 }, () => wrong()));
    expect(answers.filter(({ status }) => status === 401)).toHaveLength(5);
    expect(answers.filter(({ status }) => status === 429)).toHaveLength(7);
  });

  test('an account that does not exist is throttled just the same', async () => {
    for (let i = 0; i < 5; i++) expect((await wrong(HERE, 'nobody@harrowmere.example')).status).toBe(401);
    const answer = await wrong(HERE, 'nobody@harrowmere.example');
    expect(answer.status).toBe(429);
    expect(Number(answer.headers.get('retry-after'))).toBe(30);
  });
});
