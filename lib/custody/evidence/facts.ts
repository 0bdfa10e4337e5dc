import type { Entry } from '../entry';
import { hex } from '../pure/hash';
import { readHead } from '../pure/head';
import type { Evidence, Making } from './gather';

export interface ReportEntry {
  sequence: number;
  at: string;
  what: string;
  who: string;
  detail: string;
}

/** What both reports say, as pairs of words. */
export function reportFacts(evidence: Evidence, making: Making): [string, string][] {
  const newest = evidence.heads.at(-1);
  const root = newest ? hex(readHead(newest.note).root) : '';
  return [
    ['Recording', evidence.number],
    ['Original, SHA-256', evidence.original.sha256],
    ['Original, bytes', String(evidence.original.bytes)],
    ['Media type', evidence.original.mediaType],
    ['Device', `${evidence.device.assetTag}, ${evidence.device.maker} ${evidence.device.model}`],
    ['Serial number', evidence.device.serialNumber],
    ['Firmware', evidence.device.firmware ?? 'not told'],
    ['Key it enrolled with', evidence.device.thumbprint ?? 'none in the log'],
    ['Log', evidence.origin],
    ['Entries in the log', String(newest?.size ?? 0)],
    ['Root of the log', root],
    ['Key of the log', evidence.treeKeys.at(-1)?.verifier ?? ''],
    ['Package made', making.madeAt],
    ['By', making.madeBy],
    ['Reason', making.reason],
  ];
}

const shown = (value: unknown): string => (typeof value === 'string' ? value : JSON.stringify(value));

/** The entries in words, in the order of the log. */
export function reportEntries(evidence: Evidence): ReportEntry[] {
  return evidence.entries.map(({ canonical }) => {
    const entry = JSON.parse(canonical) as Entry;
    const { number: _number, ...detail } = entry.detail ?? {};
    const parts = Object.entries({
      ...detail,
      ...(entry.before ? { before: entry.before } : {}),
      ...(entry.after ? { after: entry.after } : {}),
    });
    return {
      sequence: entry.sequence,
      at: entry.at,
      what: entry.kind.replaceAll('-', ' '),
      who: entry.actor.role ? `${entry.actor.label}, ${entry.actor.role}` : entry.actor.label,
      detail: parts.map(([name, value]) => `${name}: ${shown(value)}`).join('; '),
    };
  });
}

export const CAUTION =
  'Technical measurements only. They do not diagnose. Follow local policy and the judgement of a licensed clinician.';

export const PROVES =
  'This report is for reading. What proves is beside it: the original, the entries, the proofs and the signed heads. VERIFY.md says how to check them with openssl and sha256sum; verify.mjs does it on bare Node 20.';
