import { insertFiling, placementOf } from '@/lib/filing/placeRecording';
import { type AnalysisPool, createAnalysisPool } from '@/lib/ingest/analysisPool';
import type { IngestServices, PlaceRecording } from '@/lib/ingest/types';
import type { Services } from '@/lib/platform/services';

/** Where ingestion and filing meet: ingestion asks in its own transaction where the clip belongs. */
const placeRecording: PlaceRecording = async (tx, clip, nowMs) => {
  const place = await placementOf(tx, clip);
  if (typeof place === 'string') return { tray: place };
  await insertFiling(tx, clip.id, place, nowMs);
  return { filed: place };
};

const shared = globalThis as { bellkeepAnalysis?: AnalysisPool };

/** The services of a request, with what only ingestion needs: the analysing threads and the way to filing. */
export function ingestServices(services: Services): IngestServices {
  shared.bellkeepAnalysis ??= createAnalysisPool({
    onFailure: (why) => services.log.error({ why }, 'a clip could not be analysed'),
  });
  return { ...services, analysis: shared.bellkeepAnalysis, place: placeRecording };
}

/** What the analysing threads do now; null where none was needed yet. */
export const analysisFigures = (): ReturnType<AnalysisPool['figures']> | null =>
  shared.bellkeepAnalysis?.figures() ?? null;

/** End the analysing threads: for commands that stop. */
export async function closeAnalysis(): Promise<void> {
  await shared.bellkeepAnalysis?.close();
  delete shared.bellkeepAnalysis;
}
