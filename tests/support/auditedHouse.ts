import { rm } from 'node:fs/promises';
import { type Client, createClient } from '@libsql/client';
import { type Database, openDatabase } from '@/db/client';
import { sendRecording } from '@/devices/agent/upload';
import { type AuditOptions, type AuditResult, auditCustody } from '@/lib/custody/audit/audit';
import type { Finding } from '@/lib/custody/audit/findings';
import { leafHashNow } from '@/lib/custody/tree/hashes';
import { headWork, tendHeads } from '@/lib/http/treeHeads';
import { runOutboxOnce } from '@/lib/platform/outbox';
import type { Services } from '@/lib/platform/services';
import { chestWav, clean, clipOf, openPassageHouse, type PassageHouse } from './passageHouse';

/** A house with recordings, heads in database and storage, and copies of its database to do damage to. */
export interface AuditedHouse {
  house: PassageHouse;
  /** Numbers of its recordings, the first sent first. */
  numbers: string[];
  /** Sizes of the heads that lie in storage, the smallest first. */
  sizes: number[];
  copies: number;
  close(): Promise<void>;
}

const work = (services: Services) =>
  runOutboxOnce(services, {
    mail: async (payload) => services.mail.send(payload as never),
    ...headWork(services),
  });

export async function openAuditedHouse(recordings: number): Promise<AuditedHouse> {
  const house = await openPassageHouse();
  const { agent } = await house.enrolled();
  const numbers: string[] = [];
  const sizes: number[] = [];
  for (let i = 0; i < recordings; i++) {
    const { answer } = await sendRecording(agent, clipOf(chestWav(clean({ seconds: 4 }), i + 1)));
    numbers.push(answer.recording);
    await tendHeads(house.services);
    await work(house.services);
    sizes.push(await sizeOf(house.services));
  }
  return {
    house,
    numbers,
    sizes,
    copies: 0,
    close: () => house.close(),
  };
}

export async function sizeOf(services: Pick<Services, 'database'>): Promise<number> {
  const { rows } = await services.database.client.execute(
    'select max(sequence) + 1 as size from custody_entry',
  );
  return Number(rows[0]?.size);
}

export interface Copy {
  services: Services;
  /** SQL past every guard. */
  sql(statement: string, args?: (string | number | Uint8Array)[]): Promise<void>;
  audit(options?: Partial<AuditOptions>): Promise<Audited>;
  close(): Promise<void>;
}

export interface Audited extends AuditResult {
  findings: Finding[];
  /** The codes that were found, each once. */
  codes: string[];
}

/** A copy of the database as it stands, with its guards taken off. */
export async function copyOf(audited: AuditedHouse): Promise<Copy> {
  const { house } = audited;
  const file = `${house.services.env.DATABASE_URL.replace('file:', '')}.copy${audited.copies++}`;
  await house.services.database.client.execute({ sql: 'vacuum into ?', args: [file] });
  const bare: Client = createClient({ url: `file:${file}` });
  const { rows } = await bare.execute(`select name from sqlite_master where type = 'trigger'`);
  for (const { name } of rows) await bare.execute(`drop trigger "${String(name)}"`);
  bare.close();
  const database: Database = await openDatabase(`file:${file}`);
  await database.writer.execute('pragma foreign_keys = off');
  const services: Services = { ...house.services, database, read: database.read, write: database.write };
  return {
    services,
    async sql(statement, args = []) {
      await database.writer.execute({ sql: statement, args });
    },
    audit: (options = {}) => audit(services, options),
    async close() {
      database.close();
      await Promise.all(['', '-wal', '-shm'].map((end) => rm(`${file}${end}`, { force: true })));
    },
  };
}

export async function audit(services: Services, options: Partial<AuditOptions> = {}): Promise<Audited> {
  const findings: Finding[] = [];
  const result = await auditCustody(services, {
    headFiles: [],
    keys: [],
    withBytes: true,
    ...options,
    onFinding: (finding) => findings.push(finding),
  });
  return { ...result, findings, codes: [...new Set(findings.map(({ code }) => code))] };
}

/** The text of an entry. */
export async function textAt(copy: Copy, sequence: number): Promise<string> {
  const { rows } = await copy.services.database.client.execute({
    sql: 'select canonical from custody_entry where sequence = ?',
    args: [sequence],
  });
  return String(rows[0]?.canonical);
}

/** Write an entry's text anew, with its leaf hash where asked. */
export async function rewrite(copy: Copy, sequence: number, text: string, rehash: boolean): Promise<void> {
  await copy.sql('update custody_entry set canonical = ? where sequence = ?', [text, sequence]);
  if (rehash)
    await copy.sql('update custody_entry set leaf_hash = ? where sequence = ?', [
      leafHashNow(text),
      sequence,
    ]);
}
