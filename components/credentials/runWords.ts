/** Shapes of the rotation routes, as their pages read them. */
export interface RunRow {
  id: string;
  label: string;
  state: 'running' | 'paused' | 'ended' | 'cancelled';
  reason: string;
  startedBy: string;
  startedAt: number;
  deadlineAt: number;
  endedAt: number | null;
  atDeadline: 'keep' | 'revoke';
  waveSize: number;
  wavePauseMs: number;
  version: number;
  counts: Record<'waiting' | 'asked' | 'done' | 'missed' | 'left-out', number>;
}
export interface MemberRow {
  credentialId: string;
  label: string;
  deviceId: string;
  assetTag: string;
  ward: string | null;
  state: keyof RunRow['counts'];
  renewed: boolean;
  askedAt: number | null;
  endedAt: number | null;
  lastHeardAt: number | null;
}

export const RUN_WORDS: Record<RunRow['state'], string> = {
  running: 'Running',
  paused: 'Paused',
  ended: 'Ended',
  cancelled: 'Cancelled',
};

export const totalOf = (run: RunRow): number => Object.values(run.counts).reduce((sum, n) => sum + n, 0);
