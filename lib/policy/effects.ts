import { and, gt, inArray, isNotNull, isNull, sql } from 'drizzle-orm';
import type { Reader } from '@/db/client';
import { credential, device, evidencePolicy, recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { AnySettings, PolicyKind, PolicySettings } from './kinds';

/** What a change would do, in sentences for whoever decides. */
export interface Effect {
  text: string;
  /** How many things; 0 where nothing changes. */
  count: number;
}

interface KindEffects {
  preview(read: Reader | Tx, settings: AnySettings, before: AnySettings, now: number): Promise<Effect[]>;
  /** In the transaction that decides. */
  apply?(tx: Tx, settings: AnySettings, now: number, personId: string): Promise<void>;
}

const DAY_MS = 86_400_000;
const things = (count: number, one: string, many: string) =>
  `${count.toLocaleString('en-GB')} ${count === 1 ? one : many}`;

const living = (now: number) =>
  and(
    inArray(credential.state, ['issued', 'in-use']),
    gt(credential.expiresAt, now),
    isNull(credential.successorId),
  );

type CredentialSettings = PolicySettings<'credentials'>;

/** From when on a credential that exists would be renewed under these settings, as SQL; UTC ms. */
function renewalUnder(settings: CredentialSettings) {
  const bound = (settings.boundLifetimeDays - settings.boundRenewBeforeDays) * DAY_MS;
  const bearer = (settings.bearerLifetimeDays - settings.bearerRenewBeforeDays) * DAY_MS;
  return sql<number>`(${credential.issuedAt} + case when ${credential.boundThumbprint} is null then ${bearer} else ${bound} end)`;
}
/** Rows of before there was a policy have the first house's times. */
const renewalNow = sql<number>`coalesce(${credential.renewAfter}, ${credential.expiresAt} - case when ${credential.boundThumbprint} is null then ${5 * DAY_MS} else ${21 * DAY_MS} end)`;

const credentials: KindEffects = {
  async preview(read, settings, _before, now) {
    const next = renewalUnder(settings as CredentialSettings);
    const [counted] = await read
      .select({
        all: sql<number>`count(*)`,
        sooner: sql<number>`coalesce(sum(${next} < ${renewalNow}), 0)`,
        atOnce: sql<number>`coalesce(sum(${next} <= ${now} and ${renewalNow} > ${now}), 0)`,
      })
      .from(credential)
      .where(living(now));
    const { all = 0, sooner = 0, atOnce = 0 } = counted ?? {};
    return [
      {
        count: sooner,
        text: `${things(sooner, 'credential', 'credentials')} of ${all.toLocaleString('en-GB')} would end sooner, because ${sooner === 1 ? 'it is' : 'they are'} renewed sooner.`,
      },
      {
        count: atOnce,
        text: `${things(atOnce, 'device', 'devices')} would be told to renew with the next call.`,
      },
      { count: 0, text: 'Nothing stops working: each credential is accepted until its successor is used.' },
    ];
  },
  async apply(tx, settings, now) {
    // Only sooner: a longer life is for those issued from now on.
    const next = renewalUnder(settings as CredentialSettings);
    await tx
      .update(credential)
      .set({ renewAfter: sql`min(${next}, ${renewalNow})` })
      .where(living(now));
  },
};

const clock: KindEffects = {
  async preview(read, settings, before) {
    const off = (seconds: number) =>
      sql<number>`coalesce(sum(abs(${device.clockOffsetMs}) >= ${seconds * 1000}), 0)`;
    const [counted] = await read
      .select({
        after: off(settings.deviceNoticeSeconds as number),
        now: off(before.deviceNoticeSeconds as number),
      })
      .from(device)
      .where(isNotNull(device.clockOffsetMs));
    const { after = 0, now = 0 } = counted ?? {};
    return [
      {
        count: after,
        text: `${things(after, 'device', 'devices')} would be named for ${after === 1 ? 'its clock' : 'their clocks'}; ${now.toLocaleString('en-GB')} now.`,
      },
    ];
  },
};

const retention: KindEffects = {
  async preview(read) {
    const [counted] = await read
      .select({ count: sql<number>`count(*)` })
      .from(recording)
      .where(isNotNull(recording.lockedUntil));
    const count = counted?.count ?? 0;
    return [
      {
        count: 0,
        text: `${things(count, 'original that is', 'originals that are')} locked already ${count === 1 ? 'keeps its lock' : 'keep their locks'}; the change rules those sealed from now on.`,
      },
    ];
  },
};

const evidence: KindEffects = {
  async preview(_read, settings, before) {
    if (settings.secondPerson === before.secondPerson) return [{ count: 0, text: 'Nothing would change.' }];
    return [
      {
        count: 1,
        text: settings.secondPerson
          ? 'From now on each package waits until somebody else approves it.'
          : 'From now on whoever may ask for a package gets it at once.',
      },
    ];
  },
  async apply(tx, settings, now, personId) {
    // Where the ledger looks it up.
    const [last] = await tx
      .select({ version: sql<number>`coalesce(max(${evidencePolicy.version}), 0)` })
      .from(evidencePolicy);
    await tx.insert(evidencePolicy).values({
      version: (last?.version ?? 0) + 1,
      secondPerson: settings.secondPerson === true,
      madeBy: personId,
      madeAt: now,
    });
  },
};

export const EFFECTS: Record<PolicyKind, KindEffects> = { credentials, clock, retention, evidence };
