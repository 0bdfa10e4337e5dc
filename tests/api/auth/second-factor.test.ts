import { readFileSync } from 'node:fs';
import { symmetricEncrypt } from 'better-auth/crypto';
import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest';
import { POST as recoveryCodesRoute } from '@/app/api/account/recovery-codes/route';
import { POST as confirmRoute } from '@/app/api/account/second-factor/confirm/route';
import { POST as removeRoute } from '@/app/api/account/second-factor/remove/route';
import { POST as beginRoute } from '@/app/api/account/second-factor/route';
import { POST as authenticatorRoute } from '@/app/api/auth/authenticator/route';
import { POST as recoveryRoute } from '@/app/api/auth/recovery-code/route';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { GET as me } from '@/app/api/me/route';
import { GET as people } from '@/app/api/people/route';
import { session, twoFactor, user } from '@/db/schema';
import { newId } from '@/lib/platform/ids';
import { call, cookiesAfter, problemOf } from '@/tests/support/call';
import { entriesOf } from '@/tests/support/entries';
import { addPerson, PASSWORD, sessionOf, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';
import { fromBase32, totp } from '@/tests/support/totp';

let house: House;
let person: TestPerson;
beforeEach(async () => {
  house = await openHouse();
  person = await addPerson(house, { roles: ['itadmin'], secondFactor: false });
});
afterEach(async () => {
  vi.useRealTimers();
  await house.close();
});

const password = (who = person) => call(signInRoute, { body: { email: who.email, password: PASSWORD } });
const code = (cookie: string, value: string) => call(authenticatorRoute, { body: { code: value }, cookie });
const recovery = (cookie: string, value: string) => call(recoveryRoute, { body: { code: value }, cookie });

interface Plan {
  secret: string;
  qrSvg: string;
  recoveryCodes: string[];
}

/** Set one up as the account page does. Codes of the next period are still unused afterwards. */
async function setUp() {
  const cookie = cookiesAfter(await password());
  const begun = await call(beginRoute, { body: { password: PASSWORD }, cookie });
  const plan = (await begun.json()) as Plan;
  const key = fromBase32(plan.secret);
  const confirmed = await call(confirmRoute, { body: { code: totp(key, Date.now()) }, cookie });
  return { plan, key, before: cookie, confirmed, cookie: cookiesAfter(confirmed) };
}

/** A code that was not entered yet: of the period after this one, which is accepted for clocks that are fast. */
const nextCode = (key: Uint8Array) => totp(key, Date.now() + 30_000);

describe('an IT administrator without a second factor', () => {
  test('reaches nothing but their own account', async () => {
    const cookie = cookiesAfter(await password());
    expect((await problemOf(await call(people, { cookie }))).code).toBe('second-factor-required');
    expect((await call(me, { cookie })).status).toBe(200);
  });

  test('sets one up and reaches the people, with a session id that is new while all others ended', async () => {
    const elsewhere = await sessionOf(house, person);
    const { before, cookie, confirmed, plan } = await setUp();
    expect(confirmed.status).toBe(200);
    expect(plan.qrSvg).toContain('<svg');
    expect(plan.recoveryCodes).toHaveLength(10);
    expect((await call(people, { cookie })).status).toBe(200);
    expect((await call(me, { cookie: before })).status).toBe(401);
    expect((await call(me, { cookie: elsewhere })).status).toBe(401);
    expect(await house.services.read.select().from(session)).toHaveLength(1);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'second-factor-set',
      actor: { id: person.id },
    });
    expect((await house.deliver()).at(-1)).toMatchObject({ to: person.email });
  });

  test('a wrong first code turns nothing on', async () => {
    const cookie = cookiesAfter(await password());
    await call(beginRoute, { body: { password: PASSWORD }, cookie });
    const refused = await call(confirmRoute, { body: { code: '000000' }, cookie });
    expect((await problemOf(refused)).code).toBe('body-invalid');
    const [row] = await house.services.read.select().from(user).where(eq(user.id, person.id));
    expect(row?.twoFactorEnabled).toBe(false);
  });

  test('a stolen session without the password sets up nothing', async () => {
    const cookie = cookiesAfter(await password());
    const refused = await call(beginRoute, { body: { password: 'wrong wrong wrong' }, cookie });
    expect((await problemOf(refused)).code).toBe('body-invalid');
    expect(await house.services.read.select().from(twoFactor)).toEqual([]);
  });

  test('secret and recovery codes are stored encrypted', async () => {
    const { plan } = await setUp();
    const [row] = await house.services.read.select().from(twoFactor);
    const stored = JSON.stringify(row);
    expect(stored).not.toContain(plan.secret);
    expect(stored).not.toContain(Buffer.from(fromBase32(plan.secret)).toString());
    for (const one of plan.recoveryCodes) expect(stored).not.toContain(one);
  });
});

describe('signing in with a second factor', () => {
  test('the password alone gives a challenge and no session', async () => {
    await setUp();
    const answer = await password();
    expect(await answer.json()).toEqual({ next: 'second-factor' });
    expect((await call(me, { cookie: cookiesAfter(answer) })).status).toBe(401);
  });

  test('password and code sign in, and the entry says so', async () => {
    const { key } = await setUp();
    const challenge = cookiesAfter(await password());
    const answer = await code(challenge, nextCode(key));
    expect(answer.status).toBe(200);
    expect((await call(people, { cookie: cookiesAfter(answer) })).status).toBe(200);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'signed-in',
      detail: { secondFactor: 'authenticator' },
    });
  });

  // RFC 6238, 5.2: "The verifier MUST NOT accept the second attempt of the OTP after the successful validation".
  test('a code that was used does not work a second time', async () => {
    const { key } = await setUp();
    const value = nextCode(key);
    expect((await code(cookiesAfter(await password()), value)).status).toBe(200);
    const again = await code(cookiesAfter(await password()), value);
    expect(again.status).toBe(401);
    expect(again.headers.getSetCookie()).toEqual([]);
  });

  test('the same code twice at the same moment gives one session', async () => {
    const { key } = await setUp();
    const challenges = [cookiesAfter(await password()), cookiesAfter(await password())];
    const value = nextCode(key);
    const answers = await Promise.all(challenges.map((challenge) => code(challenge, value)));
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 401]);
  });

  test('a recovery code works once', async () => {
    const { plan } = await setUp();
    const [first = ''] = plan.recoveryCodes;
    expect((await recovery(cookiesAfter(await password()), first)).status).toBe(200);
    expect((await recovery(cookiesAfter(await password()), first)).status).toBe(401);
  });

  test('new recovery codes end the old ones', async () => {
    const { plan, cookie } = await setUp();
    const made = await call(recoveryCodesRoute, { body: { password: PASSWORD }, cookie });
    const { recoveryCodes } = (await made.json()) as Plan;
    expect((await recovery(cookiesAfter(await password()), plan.recoveryCodes[0] ?? '')).status).toBe(401);
    expect((await recovery(cookiesAfter(await password()), recoveryCodes[0] ?? '')).status).toBe(200);
  });

  test('after five wrong codes the challenge is over, even for the right one', async () => {
    const { key } = await setUp();
    const challenge = cookiesAfter(await password());
    for (let i = 0; i < 5; i++) expect((await code(challenge, `00000${i}`)).status).toBe(401);
    const late = await problemOf(await code(challenge, nextCode(key)));
    expect(late.body).toMatchObject({ startAgain: true });
  });

  test('a code without a challenge, or with a made-up one, is nobody’s', async () => {
    const { key } = await setUp();
    const value = nextCode(key);
    expect((await code('', value)).status).toBe(401);
    expect((await code('__Secure-bellkeep.two_factor=2fa-made-up.signature', value)).status).toBe(401);
  });

  test('removing it asks for the password, and puts an administrator back to setting one up', async () => {
    const { cookie } = await setUp();
    const wrong = await call(removeRoute, { body: { password: 'wrong wrong wrong' }, cookie });
    expect((await problemOf(wrong)).code).toBe('body-invalid');
    expect((await call(removeRoute, { body: { password: PASSWORD }, cookie })).status).toBe(200);
    expect((await problemOf(await call(people, { cookie }))).code).toBe('second-factor-required');
    expect((await entriesOf(house)).at(-1)).toMatchObject({ kind: 'second-factor-removed' });
  });
});

// RFC 6238, appendix B (SHA-1 rows). The appendix prints eight digits; six are the last six of them (RFC 4226, 5.3).
describe('codes of RFC 6238', () => {
  const { totp: vectors } = JSON.parse(readFileSync('tests/reference/otp/rfc4226-rfc6238.json', 'utf8')) as {
    totp: { secretsAscii: { sha1: string }; codes: { time: number; alg: string; code: string }[] };
  };
  const rows = vectors.codes.filter(({ alg }) => alg === 'sha1');

  async function withSecretOfTheRfc() {
    const { sha1 } = vectors.secretsAscii;
    const key = house.services.env.BELLKEEP_AUTH_SECRET;
    await house.services.write(async (tx) => {
      await tx.insert(twoFactor).values({
        id: newId(),
        userId: person.id,
        secret: await symmetricEncrypt({ key, data: sha1 }),
        backupCodes: await symmetricEncrypt({ key, data: '[]' }),
        verified: true,
      });
      await tx.update(user).set({ twoFactorEnabled: true }).where(eq(user.id, person.id));
    });
  }

  test.each(rows)('$code is accepted at $time s', async ({ time, code: printed }) => {
    await withSecretOfTheRfc();
    vi.useFakeTimers({ toFake: ['Date'], now: time * 1000 });
    const challenge = cookiesAfter(await password());
    expect((await code(challenge, printed.slice(-6))).status).toBe(200);
  });

  test.each(rows)('$code is not accepted two periods after $time s', async ({ time, code: printed }) => {
    await withSecretOfTheRfc();
    vi.useFakeTimers({ toFake: ['Date'], now: (time + 60) * 1000 });
    const challenge = cookiesAfter(await password());
    expect((await code(challenge, printed.slice(-6))).status).toBe(401);
  });
});
