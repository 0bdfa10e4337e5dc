import type { CompleteAnswer } from '@/lib/contract/device';

/** What happens to a device of the fleet. */
export type FleetEvent = { serialNumber: string } & (
  | { kind: 'enrolled'; assetTag: string }
  | { kind: 'recorded'; recordingNumber: string; recipe: string }
  | { kind: 'sent'; recordingNumber: string; answer: CompleteAnswer }
  | { kind: 'refused'; recordingNumber: string | null; code: string }
  | { kind: 'renewed'; credentialId: string }
  | { kind: 'rebooted' }
  | { kind: 'clock-set'; offsetMs: number }
  | { kind: 'trouble'; why: string }
);

/** One line for a log. */
export function eventText(event: FleetEvent): string {
  const { serialNumber } = event;
  switch (event.kind) {
    case 'enrolled':
      return `${serialNumber} enrolled as ${event.assetTag}`;
    case 'recorded':
      return `${serialNumber} recorded ${event.recordingNumber}: ${event.recipe}`;
    case 'sent':
      return `${serialNumber} sent ${event.answer.recording}: ${event.answer.verdict}`;
    case 'refused':
      return `${serialNumber} was refused ${event.recordingNumber ?? 'a recording'}: ${event.code}`;
    case 'renewed':
      return `${serialNumber} renewed its credential: ${event.credentialId}`;
    case 'rebooted':
      return `${serialNumber} lost its power and woke again`;
    case 'clock-set':
      return `${serialNumber} has its clock off by ${Math.round(event.offsetMs / 1000)} s`;
    case 'trouble':
      return `${serialNumber}: ${event.why}`;
  }
}
