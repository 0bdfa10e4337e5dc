import { z } from 'zod';
import type { ClipRow } from '@/db/queries/recordings';

const LineFinding = z.object({
  code: z.string(),
  severity: z.enum(['note', 'care', 'repeat']),
  value: z.number().optional(),
  unit: z.string().optional(),
  threshold: z.number().optional(),
  from: z.number().optional(),
  to: z.number().optional(),
  channel: z.number().optional(),
});
/** A finding as it was stored: one of another age may carry a code that is not known here. */
export type LineFinding = z.infer<typeof LineFinding>;

/** Findings out of their JSON column; what is none of any age is left out. */
export const findingsOf = (stored: readonly unknown[] | null): LineFinding[] =>
  (stored ?? []).flatMap((one) => {
    const parsed = LineFinding.safeParse(one);
    return parsed.success ? [parsed.data] : [];
  });

/** A clip as a line of a list. Times are UTC milliseconds. */
export interface ClipLine {
  id: string;
  number: string;
  assetTag: string;
  site: string | null;
  recordedAt: number;
  receivedAt: number | null;
  durationSeconds: number | null;
  stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
  /** Why the passage was cut, as a problem code. */
  stopped: string | null;
  verdict: 'usable' | 'care' | 'repeat' | null;
  findings: LineFinding[];
  /** Seconds of the longest stretch without a care or repeat finding. */
  cleanStretch: { from: number; to: number } | null;
  keptAt: number | null;
  keptReason: string | null;
  version: number;
}

const isStretch = (value: unknown): value is { from: number; to: number } =>
  typeof value === 'object' &&
  value !== null &&
  typeof (value as { from?: unknown }).from === 'number' &&
  typeof (value as { to?: unknown }).to === 'number';

/** A row as a line: of the measures only what a list shows. */
export const lineOf = (row: ClipRow): ClipLine => ({
  id: row.id,
  number: row.number,
  assetTag: row.assetTag,
  site: row.site,
  recordedAt: row.recordedAt,
  receivedAt: row.receivedAt,
  durationSeconds: row.durationSeconds,
  stage: row.stage,
  stopped: row.stopped,
  verdict: row.verdict,
  findings: findingsOf(row.findings),
  cleanStretch: isStretch(row.measures?.cleanStretch) ? row.measures.cleanStretch : null,
  keptAt: row.keptAt,
  keptReason: row.keptReason,
  version: row.version,
});
