/** What can be made to go wrong, and for which requests. */
export interface FaultRule {
  kind:
    | 'delay'
    | 'slow-down'
    | 'internal-error'
    | 'full-disk'
    | 'cut-body'
    | 'wrong-bytes'
    | 'empty-listing'
    | 'answer-lost';
  /** HTTP method; any where left out. */
  method?: string | undefined;
  /** Pattern of the key; any where left out, also requests without a key. */
  key?: RegExp | string | undefined;
  /** A query parameter the request must have, such as `retention` or `uploads`. */
  parameter?: string | undefined;
  /** How many requests it meets before it is spent; without end where left out. */
  count?: number | undefined;
  /** delay: how long. */
  milliseconds?: number | undefined;
  /** cut-body: bytes sent before the cut; wrong-bytes: offset of the byte that is changed; full-disk: bytes that fit. */
  atByte?: number | undefined;
}

export const FAULT_KINDS: readonly FaultRule['kind'][] = [
  'delay',
  'slow-down',
  'internal-error',
  'full-disk',
  'cut-body',
  'wrong-bytes',
  'empty-listing',
  'answer-lost',
];

interface Standing {
  id: number;
  rule: FaultRule;
  pattern: RegExp | undefined;
  left: number;
  met: number;
}

/** The faults that one request meets. */
export class MetFaults {
  constructor(private readonly rules: readonly FaultRule[]) {}
  get(kind: FaultRule['kind']): FaultRule | undefined {
    return this.rules.find((rule) => rule.kind === kind);
  }
}

/** Faults that are switched on. Several may meet the same request. */
export class Faults {
  private standing: Standing[] = [];
  private nextId = 1;

  /** @returns a number by which the fault can be taken away again */
  add(rule: FaultRule): number {
    const id = this.nextId++;
    const pattern = rule.key === undefined ? undefined : new RegExp(rule.key);
    this.standing.push({ id, rule, pattern, left: rule.count ?? Number.POSITIVE_INFINITY, met: 0 });
    return id;
  }

  remove(id: number): void {
    this.standing = this.standing.filter((one) => one.id !== id);
  }

  clear(): void {
    this.standing = [];
  }

  /** What is switched on, with how many requests each has met. */
  list(): { id: number; rule: FaultRule; met: number }[] {
    return this.standing.map(({ id, rule, met }) => ({ id, rule, met }));
  }

  /** How many requests a fault has met. */
  met(id: number): number {
    return this.standing.find((one) => one.id === id)?.met ?? 0;
  }

  /** The faults for one request; each counts it. A spent fault stays in the list, so that `met` can be asked. */
  meet(request: { method: string; key: string | undefined; parameters: ReadonlySet<string> }): MetFaults {
    const met = this.standing.filter(
      ({ rule, pattern, left }) =>
        left > 0 &&
        (rule.method === undefined || rule.method === request.method) &&
        (pattern === undefined || (request.key !== undefined && pattern.test(request.key))) &&
        (rule.parameter === undefined || request.parameters.has(rule.parameter)),
    );
    for (const one of met) {
      one.left--;
      one.met++;
    }
    return new MetFaults(met.map(({ rule }) => rule));
  }
}
