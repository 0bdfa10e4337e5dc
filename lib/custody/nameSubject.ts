import { eq } from 'drizzle-orm';
import {
  apiClient,
  credential,
  device,
  encounter,
  listeningSession,
  patient,
  user,
  webhook,
} from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import type { Subject } from './entry';

export interface NamedSubject extends Subject {
  label: string;
}

/** What a subject is called, so that a page can head its thread; null when there is no such thing. */
export async function nameSubject(
  services: Pick<Services, 'read'>,
  kind: string,
  id: string,
): Promise<NamedSubject | null> {
  const { read } = services;
  const first = async (rows: Promise<{ label: string }[]>): Promise<NamedSubject | null> => {
    const [row] = await rows;
    return row ? { kind: kind as Subject['kind'], id, label: row.label } : null;
  };
  switch (kind) {
    case 'device':
      return await first(
        read.select({ label: device.assetTag }).from(device).where(eq(device.id, id)).limit(1),
      );
    case 'patient':
      return await first(
        read.select({ label: patient.recordNumber }).from(patient).where(eq(patient.id, id)).limit(1),
      );
    case 'encounter':
      return await first(
        read.select({ label: encounter.number }).from(encounter).where(eq(encounter.id, id)).limit(1),
      );
    case 'session':
      return await first(
        read
          .select({ label: listeningSession.number })
          .from(listeningSession)
          .where(eq(listeningSession.id, id))
          .limit(1),
      );
    case 'credential':
      return await first(
        read.select({ label: credential.label }).from(credential).where(eq(credential.id, id)).limit(1),
      );
    case 'person':
      return await first(read.select({ label: user.name }).from(user).where(eq(user.id, id)).limit(1));
    case 'policy':
      return { kind, id, label: `Policy: ${id}` };
    case 'client':
      return await first(
        read.select({ label: apiClient.name }).from(apiClient).where(eq(apiClient.id, id)).limit(1),
      );
    case 'webhook':
      return await first(
        read.select({ label: webhook.name }).from(webhook).where(eq(webhook.id, id)).limit(1),
      );
    case 'connection':
      return { kind, id, label: `Connection: ${id}` };
    default:
      return null;
  }
}
