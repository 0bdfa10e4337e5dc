import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type Database, openDatabase } from '@/db/client';
import { applyMigrations } from '@/db/migrate';

export interface FreshDatabase {
  database: Database;
  /** Path of the file, for whoever wants to open it behind the service's back. */
  file: string;
  close(): Promise<void>;
}

/** A database of its own in a folder of its own, with every migration applied. */
export async function freshDatabase(): Promise<FreshDatabase> {
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-db-'));
  const file = join(folder, 'bellkeep.db');
  const database = await openDatabase(`file:${file}`);
  await applyMigrations(database);
  return {
    database,
    file,
    async close() {
      database.close();
      await rm(folder, { recursive: true, force: true });
    },
  };
}
