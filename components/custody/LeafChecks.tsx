'use client';

import { useEffect, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Notice } from '@/components/ui/Notice';
import { Panel } from '@/components/ui/Panel';
import { checkLeaves, type LeafCheck } from '@/lib/custody/pure/checkLeaves';

type Line = { sequence: number; canonical: string; leafHash: string };

const short = (hash: string) => `${hash.slice(0, 8)}…${hash.slice(-6)}`;

/** Hashes the entries again in the reader's own browser and shows each check. */
export function LeafChecks({ lines }: { lines: readonly Line[] }) {
  const [checks, setChecks] = useState<LeafCheck[] | null>(null);
  const [failure, setFailure] = useState<string | null>(null);
  useEffect(() => {
    setChecks(null);
    checkLeaves(lines).then(setChecks, () =>
      setFailure(
        'This browser has no WebCrypto here. It is only given to pages served over HTTPS or from this machine.',
      ),
    );
  }, [lines]);
  const wrong = checks?.filter((check) => !check.right) ?? [];
  return (
    <Panel
      title="Checked in this browser"
      aside={
        <span className="text-13 font-semibold text-brass" role="status">
          {checks ? `${checks.length - wrong.length} of ${checks.length}` : 'checking'}
        </span>
      }
    >
      {failure ? (
        <Notice tone="alarm" title="Not checked">
          {failure}
        </Notice>
      ) : null}
      {checks && wrong.length > 0 ? (
        <Notice
          tone="alarm"
          title={`${wrong.length} ${wrong.length === 1 ? 'entry does' : 'entries do'} not hash to the leaf kept beside it`}
        >
          Entry {wrong.map((check) => check.sequence.toLocaleString('en-GB')).join(', ')}. Tell IT and the
          auditor before anything else is done with this recording.
        </Notice>
      ) : null}
      {checks && wrong.length === 0 ? (
        <p>
          <span aria-hidden="true" className="text-spruce">
            ✓{' '}
          </span>
          {checks.length === 1 ? 'The entry hashes' : `All ${checks.length} entries hash`} to{' '}
          {checks.length === 1 ? 'its leaf' : 'their leaves'} (RFC 6962, SHA-256).
        </p>
      ) : null}
      {checks ? (
        <details className="mt-3">
          <summary className="cursor-pointer text-13 text-ink-soft">Each leaf</summary>
          <ul className="mt-2 grid gap-1 font-mono text-13">
            {checks.map((check) => (
              <li key={check.sequence} className="flex justify-between gap-3">
                <span>
                  {check.right ? '✓' : '✗'} {check.sequence.toLocaleString('en-GB')}
                </span>
                <span title={check.computed}>{short(check.computed)}</span>
              </li>
            ))}
          </ul>
        </details>
      ) : null}
      <p className="mt-3 text-13 text-ink-soft">
        This shows that each line and its hash belong together. It does not yet show that the hashes are those
        of the signed log.
      </p>
      <div className="mt-3">
        <Button
          size="small"
          onClick={() => {
            setChecks(null);
            checkLeaves(lines).then(setChecks, () => undefined);
          }}
        >
          Check again
        </Button>
      </div>
    </Panel>
  );
}
