import type { Client } from '@libsql/client';

/** Pragmas hold for one connection only: they are set again after every reconnect. */
export async function setPragmas(client: Client): Promise<void> {
  // recursive_triggers: without it INSERT OR REPLACE deletes a row behind the delete trigger's back.
  await client.execute('PRAGMA recursive_triggers = ON');
  await client.execute('PRAGMA foreign_keys = ON');
}
