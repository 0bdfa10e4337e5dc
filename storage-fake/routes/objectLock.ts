import { answerEmpty, answerXml } from '../answer';
import { assertLockable, isoDate } from '../describe';
import { noSuchKey, notImplemented, S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import { assertMayRetain, type DefaultRetention, parseLegalHold, parseRetention } from '../locks';
import type { ObjectRecord } from '../objects';
import { childrenOf, parseXml, textOfChild } from '../xml';
import { bypassesGovernance } from './putObject';
import { receiveDocument } from './receiveBlob';

const malformed = () =>
  new S3Error(
    'MalformedXML',
    'The XML you provided was not well-formed or did not validate against our published schema',
  );

async function update(exchange: KeyExchange, change: (current: ObjectRecord) => ObjectRecord): Promise<void> {
  const { store, bucket, key } = exchange;
  await store.commit(bucket, key, (current) => {
    if (current === undefined) throw noSuchKey(key);
    return change(current);
  });
  await answerEmpty(exchange, 200);
}

function existing({ bucket, key }: KeyExchange): ObjectRecord {
  const record = bucket.index.get(key);
  if (record === undefined) throw noSuchKey(key);
  return record;
}

const noLock = () =>
  new S3Error(
    'NoSuchObjectLockConfiguration',
    'The specified object does not have a ObjectLock configuration',
  );

export async function putRetention(exchange: KeyExchange): Promise<void> {
  assertLockable(exchange);
  existing(exchange);
  const root = parseXml((await receiveDocument(exchange)).text);
  if (root.name !== 'Retention') throw malformed();
  const mode = textOfChild(root, 'Mode');
  const next =
    mode === undefined
      ? undefined
      : parseRetention(mode, textOfChild(root, 'RetainUntilDate'), exchange.nowMs());
  await update(exchange, (current) => {
    assertMayRetain(current, next, exchange.nowMs(), bypassesGovernance(exchange));
    return { ...current, retention: next };
  });
}

export async function getRetention(exchange: KeyExchange): Promise<void> {
  assertLockable(exchange);
  const { retention } = existing(exchange);
  if (retention === undefined) throw noLock();
  await answerXml(exchange, 'Retention', {
    Mode: retention.mode,
    RetainUntilDate: isoDate(retention.untilMs),
  });
}

export async function putLegalHold(exchange: KeyExchange): Promise<void> {
  assertLockable(exchange);
  existing(exchange);
  const root = parseXml((await receiveDocument(exchange)).text);
  if (root.name !== 'LegalHold') throw malformed();
  const legalHold = parseLegalHold(textOfChild(root, 'Status'));
  await update(exchange, (current) => ({ ...current, legalHold }));
}

export async function getLegalHold(exchange: KeyExchange): Promise<void> {
  assertLockable(exchange);
  const { legalHold } = existing(exchange);
  if (legalHold === undefined) throw noLock();
  await answerXml(exchange, 'LegalHold', { Status: legalHold ? 'ON' : 'OFF' });
}

export async function getLockConfiguration(exchange: BucketExchange): Promise<void> {
  const { behaviour, bucket } = exchange;
  if (behaviour.objectLock === 'unknown') throw notImplemented();
  if (behaviour.objectLock === 'absent' || !bucket.record.objectLock) {
    throw new S3Error(
      'ObjectLockConfigurationNotFoundError',
      'Object Lock configuration does not exist for this bucket',
    );
  }
  const rule = bucket.record.defaultRetention;
  await answerXml(exchange, 'ObjectLockConfiguration', {
    ObjectLockEnabled: 'Enabled',
    Rule: rule && { DefaultRetention: { Mode: rule.mode, [rule.unit]: rule.length } },
  });
}

/** Object lock can be switched on and given a default; it is never switched off. */
export async function putLockConfiguration(exchange: BucketExchange): Promise<void> {
  const { behaviour, bucket, store } = exchange;
  if (behaviour.objectLock !== 'present') throw notImplemented();
  const root = parseXml((await receiveDocument(exchange)).text);
  if (root.name !== 'ObjectLockConfiguration' || textOfChild(root, 'ObjectLockEnabled') !== 'Enabled')
    throw malformed();
  const [rule] = childrenOf(root, 'Rule');
  const [retention] = rule === undefined ? [] : childrenOf(rule, 'DefaultRetention');
  let defaultRetention: DefaultRetention | undefined;
  if (retention !== undefined) {
    const mode = textOfChild(retention, 'Mode');
    const [days, years] = [textOfChild(retention, 'Days'), textOfChild(retention, 'Years')];
    const length = Number(days ?? years);
    if ((mode !== 'COMPLIANCE' && mode !== 'GOVERNANCE') || (days === undefined) === (years === undefined))
      throw malformed();
    if (!Number.isInteger(length) || length < 1) throw malformed();
    defaultRetention = { mode, unit: days === undefined ? 'Years' : 'Days', length };
  }
  await store.updateBucket(bucket, { ...bucket.record, objectLock: true, defaultRetention });
  await answerEmpty(exchange, 200);
}
