'use client';

import { findingSentence } from '@/lib/acoustics/sentences';
import type { Severity } from '@/lib/acoustics/types';
import { valueInWords } from './figures';
import { type Stretch, stretchInWords } from './stage/view';
import { VerdictMark, verdictOfSeverity } from './VerdictMark';

/** A finding as the API and the database hold it: of an older version it may carry a code unknown here. */
export interface ShownFinding {
  code: string;
  severity: Severity;
  value?: number | undefined;
  unit?: string | undefined;
  threshold?: number | undefined;
  from?: number | undefined;
  to?: number | undefined;
  channel?: number | undefined;
}

const ORDER: Record<Severity, number> = { repeat: 0, care: 1, note: 2 };
export const worstFirst = (findings: readonly ShownFinding[]): ShownFinding[] =>
  [...findings].sort((a, b) => ORDER[a.severity] - ORDER[b.severity] || (a.from ?? 0) - (b.from ?? 0));

export interface FindingsTableProps {
  findings: readonly ShownFinding[];
  /** Makes the place of a finding a button that selects it on the stage. */
  onSelect?: (stretch: Stretch) => void;
}

/** Every finding with where, how much, its limit and what it means, the worst first. */
export function FindingsTable({ findings, onSelect }: FindingsTableProps) {
  if (findings.length === 0)
    return <p className="text-ink-soft">No findings: nothing speaks against this recording.</p>;
  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: a box that scrolls must be reachable by keyboard
    <section className="overflow-x-auto" aria-label="Findings" tabIndex={0}>
      <table className="table">
        <caption className="sr-only">Findings</caption>
        <thead>
          <tr>
            <th scope="col">Finding</th>
            <th scope="col">Where</th>
            <th scope="col" className="num">
              Value
            </th>
            <th scope="col" className="num">
              Limit
            </th>
            <th scope="col" className="min-w-64">
              What it means
            </th>
          </tr>
        </thead>
        <tbody>
          {worstFirst(findings).map((finding) => (
            <FindingRow
              key={`${finding.code}-${finding.channel ?? ''}-${finding.from ?? ''}-${finding.value ?? ''}`}
              finding={finding}
              onSelect={onSelect}
            />
          ))}
        </tbody>
      </table>
    </section>
  );
}

function FindingRow({ finding, onSelect }: { finding: ShownFinding } & Pick<FindingsTableProps, 'onSelect'>) {
  const { title, meaning, action } = findingSentence(finding);
  const verdict = verdictOfSeverity(finding.severity);
  const name = finding.channel === undefined ? title : `${title}, channel ${finding.channel + 1}`;
  return (
    <tr>
      <td>{verdict ? <VerdictMark verdict={verdict}>{name}</VerdictMark> : name}</td>
      <td>
        <Place finding={finding} onSelect={onSelect} />
      </td>
      <td className="num">{valueInWords(finding.value, finding.unit)}</td>
      <td className="num">{valueInWords(finding.threshold, finding.unit)}</td>
      <td className="wrap">
        {meaning} {finding.severity === 'note' ? null : action}
      </td>
    </tr>
  );
}

function Place({ finding, onSelect }: { finding: ShownFinding } & Pick<FindingsTableProps, 'onSelect'>) {
  const { from, to } = finding;
  if (from === undefined || to === undefined) return <span className="text-ink-soft">whole clip</span>;
  if (!onSelect) return stretchInWords({ from, to });
  return (
    <button type="button" className="link min-h-6" onClick={() => onSelect({ from, to })}>
      {stretchInWords({ from, to })}
    </button>
  );
}
