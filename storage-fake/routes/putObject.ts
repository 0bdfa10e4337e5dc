import { answerEmpty } from '../answer';
import { checkWriteConditions } from '../conditions';
import { assertIntegrityDeclared, checksumHeaders, describeFrom, quoted } from '../describe';
import type { KeyExchange } from '../exchange';
import { assertUnlocked } from '../locks';
import type { ObjectRecord } from '../objects';
import { receiveBlob } from './receiveBlob';

export const bypassesGovernance = (exchange: KeyExchange): boolean =>
  exchange.request.header('x-amz-bypass-governance-retention')?.toLowerCase() === 'true';

/** Whether the request may replace what is there now. Asked before the body, and again at the moment of the change. */
export function assertMayWrite(exchange: KeyExchange, current: ObjectRecord | undefined): void {
  if (!exchange.behaviour.ignoreWriteConditions) {
    checkWriteConditions((name) => exchange.request.header(name), exchange.key, current);
  }
  assertUnlocked(current, exchange.nowMs(), bypassesGovernance(exchange));
}

export async function putObject(exchange: KeyExchange): Promise<void> {
  const { bucket, key, store } = exchange;
  const description = describeFrom(exchange);
  assertIntegrityDeclared(exchange);
  assertMayWrite(exchange, bucket.index.get(key));
  const record = await receiveBlob(exchange, (blob, received) =>
    store.commit(bucket, key, (current) => {
      assertMayWrite(exchange, current);
      return {
        key,
        blob,
        sizeBytes: received.size,
        etag: received.md5.toString('hex'),
        modifiedMs: exchange.nowMs(),
        ...description,
        checksums: received.checksums,
        checksumType: received.declared === undefined ? undefined : 'FULL_OBJECT',
      };
    }),
  );
  await answerEmpty(exchange, 200, {
    etag: quoted(record.etag),
    ...checksumHeaders(record),
    'x-amz-server-side-encryption': record.system['x-amz-server-side-encryption'],
  });
}
