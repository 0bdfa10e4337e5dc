/** A session and its clips as the API answers them. */
export interface Clip {
  id: string;
  number: string;
  site: string | null;
  recordedAt: number;
  receivedAt: number | null;
  durationSeconds: number | null;
  stage: 'awaited' | 'received' | 'sealed' | 'measured' | 'filed';
  stopped: string | null;
  verdict: 'usable' | 'care' | 'repeat' | null;
  findings:
    | {
        code: string;
        severity: 'note' | 'care' | 'repeat';
        value?: number;
        unit?: string;
        threshold?: number;
        from?: number;
        to?: number;
      }[]
    | null;
  cleanStretch: { from: number; to: number } | null;
  keptAt: number | null;
}

export interface Session {
  id: string;
  number: string;
  openedAt: number;
  closedAt: number | null;
  encounterId: string;
  encounterNumber: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  assetTag: string;
  model: string;
  deviceId: string;
  lastCheckAt: number | null;
  checkDueAt: number | null;
  clips: Clip[];
}
