import { desc, eq, or, sql } from 'drizzle-orm';
import { device } from '@/db/schema';
import type { Tx } from '@/db/write';
import { Refusal } from '@/lib/platform/errors';

/** Symbology identifier that a scanner may put before what it read (ISO/IEC 15424), as `]d2`; and the FNC1 separator. */
const SCANNER_MARKS = /^\][A-Za-z]\d|[\p{Cc}()\s]/gu;

/** A UDI without what only scanners or only people write: marks, brackets, separators. */
const bareUdi = (text: string): string => text.replace(SCANNER_MARKS, '');
const storedUdi = sql`replace(replace(replace(replace(${device.udi}, '(', ''), ')', ''), ' ', ''), char(29), '')`;

/**
 * The device that goes by an asset tag, serial number or UDI, typed or scanned. An asset tag is the hospital's own and
 * names one device, so it goes before a serial number that reads the same.
 *
 * @throws Refusal `not-possible` when there is none, more than one, or it is not in service
 */
export async function findDevice(tx: Tx, word: string): Promise<typeof device.$inferSelect> {
  const rows = await tx
    .select()
    .from(device)
    .where(
      or(
        eq(sql`upper(${device.assetTag})`, word.toUpperCase()),
        eq(device.serialNumber, word),
        eq(storedUdi, bareUdi(word)),
      ),
    )
    .orderBy(desc(sql`upper(${device.assetTag}) = ${word.toUpperCase()}`))
    .limit(2);
  const tagged = rows.find((row) => row.assetTag.toUpperCase() === word.toUpperCase());
  const found = tagged ?? rows[0];
  if (!found)
    throw new Refusal(
      'not-possible',
      `No device goes by “${word}”. Scan its label again, or type the asset tag.`,
    );
  if (!tagged && rows.length > 1)
    throw new Refusal('not-possible', `More than one device goes by “${word}”. Type the asset tag.`);
  if (found.state !== 'in-service')
    throw new Refusal(
      'not-possible',
      `${found.assetTag} is ${found.state.replace('-', ' ')}. Take another stethoscope.`,
    );
  return found;
}
