import { S3Error } from './errors';

// Object lock ("Locking objects with Object Lock", Amazon S3 user guide), for a store that keeps one version of a
// key: here a lock also refuses an overwrite, which in S3 would have made a new version above the locked one.

export interface Retention {
  mode: 'COMPLIANCE' | 'GOVERNANCE';
  untilMs: number;
}

export interface Locked {
  retention?: Retention | undefined;
  legalHold?: boolean | undefined;
}

/** Retention that a bucket gives to every new object. */
export interface DefaultRetention {
  mode: Retention['mode'];
  unit: 'Days' | 'Years';
  length: number;
}

const refused = () => new S3Error('AccessDenied', 'Access Denied because object protected by object lock.');

/** @throws S3Error AccessDenied where a lock forbids to overwrite or remove the object */
export function assertUnlocked(object: Locked | undefined, nowMs: number, bypassGovernance: boolean): void {
  if (object === undefined) return;
  if (object.legalHold) throw refused();
  const { retention } = object;
  if (retention === undefined || retention.untilMs <= nowMs) return;
  if (retention.mode === 'GOVERNANCE' && bypassGovernance) return;
  throw refused();
}

/**
 * @throws S3Error AccessDenied where the change would shorten or weaken a retention that still runs
 */
export function assertMayRetain(
  object: Locked,
  next: Retention | undefined,
  nowMs: number,
  bypass: boolean,
): void {
  const { retention } = object;
  if (retention === undefined || retention.untilMs <= nowMs) return;
  if (retention.mode === 'GOVERNANCE' && bypass) return;
  const stronger =
    next !== undefined &&
    next.untilMs >= retention.untilMs &&
    (next.mode === retention.mode || next.mode === 'COMPLIANCE');
  if (!stronger) throw refused();
}

/** @throws S3Error where the words or the date are wrong */
export function parseRetention(
  mode: string | undefined,
  until: string | undefined,
  nowMs: number,
): Retention {
  if (mode !== 'COMPLIANCE' && mode !== 'GOVERNANCE') {
    throw new S3Error('InvalidArgument', 'Unknown wormMode directive.', {
      ArgumentName: 'x-amz-object-lock-mode',
    });
  }
  const untilMs = Date.parse(until ?? '');
  if (Number.isNaN(untilMs)) {
    throw new S3Error('InvalidArgument', 'The retain until date must be provided in ISO 8601 format');
  }
  if (untilMs <= nowMs) throw new S3Error('InvalidArgument', 'The retain until date must be in the future!');
  return { mode, untilMs };
}

export function parseLegalHold(text: string | undefined): boolean {
  if (text === 'ON' || text === 'OFF') return text === 'ON';
  throw new S3Error('InvalidArgument', "Legal Hold must be either of 'ON' or 'OFF'");
}

export function defaultRetention(rule: DefaultRetention | undefined, nowMs: number): Retention | undefined {
  if (rule === undefined) return undefined;
  const until = new Date(nowMs);
  if (rule.unit === 'Days') until.setUTCDate(until.getUTCDate() + rule.length);
  else until.setUTCFullYear(until.getUTCFullYear() + rule.length);
  return { mode: rule.mode, untilMs: until.getTime() };
}
