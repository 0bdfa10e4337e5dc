import { mkdirSync } from 'node:fs';
import { dirname } from 'node:path';
import { type Client, createClient } from '@libsql/client';
import { drizzle, type LibSQLDatabase } from 'drizzle-orm/libsql';
import { setPragmas } from './pragmas';
import * as schema from './schema';
import { createWriteQueue, type WriteQueue } from './write';

export type Schema = typeof schema;
export type Reader = LibSQLDatabase<Schema>;

/** One way in for reading, one queue for writing. Nothing else touches the file. */
export interface Database extends WriteQueue {
  read: Reader;
  /** Raw client for migrations, backups and the audit; never while a write may be open. */
  client: Client;
  writer: Client;
  close(): void;
}

const WAIT_FOR_OTHER_PROCESS_MS = 10_000;

/**
 * Open the database: a reader client and a writer client of one connection behind a queue. Several transactions
 * at once in one process would block the event loop or fail busy, so writes wait for each other here.
 *
 * @param url `file:PATH`, or the address of a libSQL server
 */
export async function openDatabase(url: string, authToken?: string): Promise<Database> {
  const isFile = url.startsWith('file:');
  if (isFile) mkdirSync(dirname(url.slice('file:'.length)), { recursive: true });
  const config = { url, ...(authToken ? { authToken } : {}), timeout: WAIT_FOR_OTHER_PROCESS_MS };
  const writer = createClient({ ...config, concurrency: 1 });
  if (isFile) {
    await writer.execute('PRAGMA journal_mode = WAL');
    await setPragmas(writer);
  }
  const client = createClient({ ...config, concurrency: 1 });
  if (isFile) await setPragmas(client);
  return {
    read: drizzle(client, { schema }),
    ...createWriteQueue(writer, isFile),
    client,
    writer,
    close() {
      client.close();
      writer.close();
    },
  };
}
