import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { drizzle } from 'drizzle-orm/libsql';
import { migrate } from 'drizzle-orm/libsql/migrator';
import { type Database, openDatabase } from './client';

/** Bring the database to this version. Safe to run by several processes and again: what was applied is skipped. */
export async function applyMigrations(database: Database, folder?: string): Promise<void> {
  const migrationsFolder = folder ?? join(/* turbopackIgnore: true */ process.cwd(), 'db', 'migrations');
  await migrate(drizzle(database.writer), { migrationsFolder });
  // The migrator switches foreign keys off and on; recursive triggers are not its concern but ours.
  await database.writer.execute('PRAGMA recursive_triggers = ON');
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const database = await openDatabase(
    process.env.DATABASE_URL ?? 'file:.data/bellkeep.db',
    process.env.DATABASE_AUTH_TOKEN,
  );
  await applyMigrations(database);
  database.close();
  console.log('The database is up to date.');
}
