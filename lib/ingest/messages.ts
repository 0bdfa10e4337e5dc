import type { Finding, JudgingLimits, Measures, Verdict } from '@/lib/acoustics/types';

/** What the ingesting thread and the analysing thread say to each other. Everything here can be cloned. */
export interface AnalysisRequest {
  mediaType: string;
  totalBytes: number;
  limits: JudgingLimits;
}

export interface AnalysisResult {
  verdict: Verdict;
  findings: Finding[];
  measures: Measures | null;
  /** What the judging needs beside the measures, so that it can be run again over stored rows. */
  facts: Record<string, unknown>;
  /** Tags and codec facts that the file carries, as music-metadata reads them. */
  metadata: Record<string, unknown> | null;
  /** Encoded pictures; null where nothing could be decoded. */
  peaks: Uint8Array | null;
  spectrogram: Uint8Array | null;
}

export type ToWorker =
  | { type: 'start'; request: AnalysisRequest }
  | { type: 'chunk'; bytes: Uint8Array }
  | { type: 'end' };
/** `ready` once, when the thread's code runs. */
export type FromWorker =
  | { type: 'ready' }
  | { type: 'taken' }
  | { type: 'result'; result: AnalysisResult }
  | { type: 'failed'; message: string };
