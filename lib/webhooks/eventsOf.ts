import type { EventType } from '@/lib/contract/events';
import type { Entry } from '@/lib/custody/entry';

export interface HouseEvent {
  /** The same however often it is told. */
  id: string;
  type: EventType;
  /** RFC 3339. */
  at: string;
  data: Record<string, unknown>;
}

type Data = Record<string, unknown>;
type AssetTag = (deviceId: string) => string | null;

const codesOf = (findings: unknown): unknown[] =>
  Array.isArray(findings) ? findings.map((one) => (one as { code?: unknown }).code) : [];

const deviceOf = (entry: Entry, tagOf: AssetTag): Data => {
  const id = entry.subjects.find(({ kind }) => kind === 'device')?.id;
  const device = entry.actor.kind === 'device' ? entry.actor.label : id ? tagOf(id) : null;
  return device ? { device } : {};
};

function stateChanged(entry: Entry, tagOf: AssetTag): [EventType, Data][] {
  const data = { ...deviceOf(entry, tagOf), from: entry.before?.state, to: entry.after?.state };
  const changed: [EventType, Data] = ['device.state-changed', data];
  return entry.after?.state === 'lost' ? [changed, ['device.lost', data]] : [changed];
}

const MAKERS: Partial<Record<Entry['kind'], (entry: Entry, tagOf: AssetTag) => [EventType, Data][]>> = {
  measured: (entry, tagOf) => [
    [
      'recording.judged',
      {
        recording: entry.detail?.number,
        ...deviceOf(entry, tagOf),
        verdict: entry.detail?.verdict,
        findings: codesOf(entry.detail?.findings),
      },
    ],
  ],
  filed: (entry, tagOf) => [
    [
      'recording.filed',
      {
        recording: entry.detail?.number,
        ...deviceOf(entry, tagOf),
        encounter: entry.detail?.encounter,
        by: entry.detail?.by,
      },
    ],
  ],
  'filing-superseded': (entry) => [
    ['recording.moved', { recording: entry.detail?.number, from: entry.detail?.from, to: entry.detail?.to }],
  ],
  'bytes-quarantined': (entry, tagOf) => [
    ['recording.quarantined', { recording: entry.detail?.number, ...deviceOf(entry, tagOf) }],
  ],
  'device-enrolled': (entry, tagOf) => [['device.enrolled', deviceOf(entry, tagOf)]],
  'device-state-changed': stateChanged,
  'device-lost': stateChanged,
  'device-found': stateChanged,
  'credential-quarantined': (entry, tagOf) => [
    ['credential.alarm', { ...deviceOf(entry, tagOf), why: 'its family is quarantined' }],
  ],
  'credential-misused': (entry, tagOf) => [
    ['credential.alarm', { ...deviceOf(entry, tagOf), why: entry.detail?.why }],
  ],
  'policy-changed': (entry) => [
    ['policy.changed', { policy: entry.detail?.policy, version: entry.detail?.version }],
  ],
};

/**
 * What other systems are told of an entry: named members only, never the entry as it is, so that nothing that is added
 * to the log leaves the house by itself. No patient is in any of them.
 */
export const eventsOf = (entry: Entry, tagOf: AssetTag): HouseEvent[] =>
  (MAKERS[entry.kind]?.(entry, tagOf) ?? []).map(([type, data]) => ({
    id: `e-${entry.sequence}-${type}`,
    type,
    at: entry.at,
    data,
  }));
