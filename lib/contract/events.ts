/** What other systems may be told of, and in which words it is offered. A name that exists is not renamed. */
export const EVENTS = {
  'recording.judged': 'A recording was judged: number, device, verdict, findings.',
  'recording.filed': 'A recording was filed: number, encounter number, by what.',
  'recording.moved': 'A recording was moved to another encounter.',
  'recording.quarantined': 'Bytes arrived that were not the announced ones.',
  'device.enrolled': 'A device enrolled.',
  'device.state-changed': 'A device was put into another service state.',
  'device.lost': 'A device was reported lost.',
  'credential.alarm': 'A credential that had ended was used.',
  'policy.changed': 'A policy was decided on.',
} as const;
export type EventType = keyof typeof EVENTS;
export const EVENT_TYPES = Object.keys(EVENTS) as [EventType, ...EventType[]];
/** Sent by the test button alone. */
export const TEST_EVENT = 'webhook.test';
