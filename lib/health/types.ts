/** How one part is: `care` wants a look soon, `alarm` now. */
export type HealthState = 'good' | 'care' | 'alarm';

export interface HealthPart {
  id: 'database' | 'storage' | 'outbox' | 'sweep' | 'heads' | 'pool' | 'clocks' | 'disk';
  title: string;
  state: HealthState;
  /** What is so, one sentence. */
  sentence: string;
  figures: { term: string; value: string; href?: string }[];
}

export const worstOf = (parts: readonly { state: HealthState }[]): HealthState =>
  parts.some(({ state }) => state === 'alarm')
    ? 'alarm'
    : parts.some(({ state }) => state === 'care')
      ? 'care'
      : 'good';

export const count = (n: number, one: string, many: string): string =>
  `${n.toLocaleString('en-GB')} ${n === 1 ? one : many}`;
