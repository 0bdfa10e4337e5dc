import type { recording } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Services } from '@/lib/platform/services';
import type { AnalysisPool } from './analysisPool';

export type RecordingRow = typeof recording.$inferSelect;

export interface Placed {
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  by: 'session' | 'identifier';
  sessionNumber: string | null;
}
/** Where the clip belongs, asked inside the transaction that writes its measures; writes the filing itself. */
export type PlaceRecording = (
  tx: Tx,
  clip: Pick<RecordingRow, 'id' | 'deviceId' | 'recordedAt' | 'scannedIdentifier'>,
  nowMs: number,
) => Promise<{ filed: Placed } | { tray: string }>;

export type IngestServices = Pick<Services, 'read' | 'write' | 'clock' | 'storage' | 'env' | 'log'> & {
  analysis: AnalysisPool;
  place: PlaceRecording;
};
