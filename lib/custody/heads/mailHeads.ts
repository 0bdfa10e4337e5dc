import { and, asc, desc, eq, gt, isNull } from 'drizzle-orm';
import { custodyHead, custodyHeadMail, personRole, user } from '@/db/schema';
import type { Tx } from '@/db/write';
import { enqueueMail } from '@/lib/mail/enqueue';
import type { Services } from '@/lib/platform/services';
import { verifierLines } from './headKeys';

/** Heads in one letter: the last of each hour, and no more than a day of hours. */
const MOST_HEADS = 24;
const MOST_READ = 5_000;
const HOUR_MS = 3_600_000;

/** YYYY-MM-DD in the hospital's zone. */
const localDay = (at: number, zone: string): string =>
  new Intl.DateTimeFormat('en-CA', { timeZone: zone, dateStyle: 'short' }).format(at);

/**
 * Send the auditors the heads made since the last letter, once a day in the hospital's zone: what they hold is out of
 * reach of whoever administers the database and the store.
 *
 * @returns how many people were written to, or null where there was nothing to send or it was sent already
 */
export async function mailHeads(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env'>,
): Promise<number | null> {
  const now = services.clock.now();
  const day = localDay(now, services.env.BELLKEEP_TIME_ZONE);
  const [last] = await services.read
    .select()
    .from(custodyHeadMail)
    .orderBy(desc(custodyHeadMail.day))
    .limit(1);
  // A clock that was set back sends nothing until the day comes again.
  if (last && last.day >= day) return null;
  const heads = await headsSince(services, last?.size ?? 0);
  const newest = heads.at(-1);
  if (!newest) return null;
  const keys = await verifierLines(services);
  const text = letter(services.env, day, heads, keys);
  // The letters and the note that they were written commit together; another process that did it first wins.
  return await services.write(async (tx) => {
    const [already] = await tx.select().from(custodyHeadMail).where(eq(custodyHeadMail.day, day)).limit(1);
    if (already) return null;
    const auditors = await auditorsOf(tx);
    if (auditors.length === 0) return null;
    await tx
      .insert(custodyHeadMail)
      .values({ day, size: newest.size, recipients: auditors.length, madeAt: now });
    for (const { email } of auditors)
      await enqueueMail(tx, now, {
        to: email,
        subject: `Tree heads of ${services.env.BELLKEEP_CUSTODY_ORIGIN}, ${day}`,
        text,
      });
    return auditors.length;
  });
}

async function auditorsOf(tx: Tx): Promise<{ email: string }[]> {
  return await tx
    .select({ email: user.email })
    .from(personRole)
    .innerJoin(user, eq(user.id, personRole.personId))
    .where(and(eq(personRole.role, 'auditor'), isNull(user.leftAt)))
    .orderBy(asc(user.email));
}

interface MadeHead {
  size: number;
  note: string;
  madeAt: number;
}

async function headsSince(services: Pick<Services, 'read'>, size: number): Promise<MadeHead[]> {
  const rows = await services.read
    .select({ size: custodyHead.size, note: custodyHead.note, madeAt: custodyHead.madeAt })
    .from(custodyHead)
    .where(gt(custodyHead.size, size))
    .orderBy(desc(custodyHead.size))
    .limit(MOST_READ);
  const hours = new Map<number, MadeHead>();
  for (const row of rows) {
    const hour = Math.floor(row.madeAt / HOUR_MS);
    if (!hours.has(hour)) hours.set(hour, row);
  }
  return [...hours.values()].slice(0, MOST_HEADS).sort((a, b) => a.size - b.size);
}

const letter = (
  env: Pick<Services['env'], 'BELLKEEP_HOSPITAL' | 'BELLKEEP_CUSTODY_ORIGIN' | 'BELLKEEP_ORIGIN'>,
  day: string,
  heads: readonly MadeHead[],
  keys: readonly string[],
): string => `Signed heads of the custody log of ${env.BELLKEEP_HOSPITAL}, sent on ${day}.

Keep this message. Each head below fixes every entry that the log held at that moment: whoever changes, removes,
inserts or moves one later can be shown to have done so by what you hold. Hold a head against the log on

  ${env.BELLKEEP_ORIGIN}/ledger/heads

or give this message to whoever runs the custody audit. The key that signs the heads, which you should compare
with the one of your first message:

${keys.join('\n')}

${heads.map(({ note }) => note).join('\n')}`;
