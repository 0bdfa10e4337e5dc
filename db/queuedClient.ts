import type { Client, InStatement } from '@libsql/client';
import type { Database } from './client';

const isRead = (statement: InStatement): boolean =>
  /^\s*(select|with|explain)\b/i.test(typeof statement === 'string' ? statement : statement.sql);

/**
 * A client for packages that write by themselves: reads go to the reader, writes wait their turn in the write queue.
 * It offers no transactions, because one that is held open across a package's own awaits would stop everybody.
 */
export function queuedClient(database: Database): Client {
  const refuse = () => Promise.reject(new Error('this client has no transactions: use the write queue'));
  const execute = (statement: InStatement) =>
    isRead(statement)
      ? database.client.execute(statement)
      : database.alone((writer) => writer.execute(statement));
  return {
    execute,
    batch: refuse,
    migrate: refuse,
    transaction: refuse,
    executeMultiple: refuse,
    sync: refuse,
    reconnect: () => undefined,
    close: () => undefined,
    closed: false,
    protocol: 'file',
  } as unknown as Client;
}
