import canonicalize from 'canonicalize';

/** What may stand in the log. A new kind may be added; one that exists is not renamed. */
export const ENTRY_KINDS = [
  'log-opened',
  'model-described',
  'device-added',
  'device-changed',
  'device-state-changed',
  'device-firmware-changed',
  'enrolment-code-issued',
  'enrolment-code-refused',
  'device-enrolled',
  'credential-issued',
  'credential-renewal-asked',
  'credential-renewed',
  'credential-first-used',
  'credential-retired',
  'credential-revoked',
  'credential-misused',
  'signing-key-made',
  'credential-quarantined',
  'rotation-started',
  'rotation-paused',
  'rotation-resumed',
  'rotation-cancelled',
  'rotation-ended',
  'device-lost',
  'device-found',
  'signing-key-superseded',
  'signing-key-distrusted',
  'signing-key-retired',
  'slot-issued',
  'slot-refused',
  'received',
  'bytes-quarantined',
  'sealed',
  'measured',
  'filed',
  'filing-superseded',
  'put-in-tray',
  'kept-anyway',
  'heard',
  'downloaded',
  'looked-at',
  'copied',
  'exported',
  'evidence-asked',
  'evidence-decided',
  'session-opened',
  'session-closed',
  'access-outside-wards',
  'reading-signed',
  'person-invited',
  'invitation-withdrawn',
  'person-joined',
  'role-given',
  'role-taken',
  'wards-changed',
  'person-left',
  'signed-in',
  'sign-in-refused',
  'sessions-ended',
  'second-factor-set',
  'second-factor-removed',
  'password-reset',
  'policy-changed',
  'connection-changed',
  'connection-tested',
  'passkey-added',
  'passkey-removed',
  'sign-on-linked',
  'client-created',
  'client-rotated',
  'client-revoked',
  'webhook-added',
  'webhook-changed',
  'webhook-removed',
  'delivery-repeated',
] as const;
export type EntryKind = (typeof ENTRY_KINDS)[number];

export interface Actor {
  kind: 'person' | 'device' | 'service';
  id: string;
  /** Staff name or asset tag at that time; never a patient. */
  label: string;
  role?: string;
}

export interface Subject {
  kind:
    | 'recording'
    | 'patient'
    | 'encounter'
    | 'person'
    | 'device'
    | 'model'
    | 'credential'
    | 'session'
    | 'signing-key'
    | 'rotation'
    | 'policy'
    | 'invitation'
    | 'connection'
    | 'client'
    | 'webhook';
  id: string;
}

/** A line to append. `detail` is small JSON: no tokens, no patients' names, no free text longer than a reason. */
export interface NewEntry {
  kind: EntryKind;
  actor: Actor;
  subjects: Subject[];
  detail?: Record<string, unknown>;
  before?: Record<string, unknown>;
  after?: Record<string, unknown>;
}

export interface Entry extends NewEntry {
  sequence: number;
  /** RFC 3339 in UTC with milliseconds. */
  at: string;
}

export const SERVICE_ACTOR: Actor = { kind: 'service', id: 'bellkeep', label: 'Bellkeep' };

/** The entry as its leaf is computed: RFC 8785 canonical JSON. Members that are undefined are left out. */
export function canonicalEntry(entry: Entry): string {
  const text = canonicalize(JSON.parse(JSON.stringify({ version: 1, ...entry })));
  if (text === undefined) throw new Error('an entry is an object');
  return text;
}
